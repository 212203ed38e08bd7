// SPDX-License-Identifier: GPL-3.0-or-later
// Benchmark: judging a recording beside reading it alone, and beside watch::add with what it is handed. Run
// by hand: build/tests/speed/judge_speed [FOLDER]
#include "halfplane/kernels/noise.h"
#include "halfplane/link/judge.h"
#include "halfplane/set_file.h"

#include <chrono>
#include <cstdio>
#include <fstream>
#include <string>
#include <vector>

using namespace halfplane;
using namespace halfplane::link;

namespace {

constexpr std::size_t symbols = 1 << 22;
constexpr int rounds = 5;

template <typename Work>
double best_speed(Work work)
{
    using clock = std::chrono::steady_clock;
    double best = 0;
    for (int round = 0; round < rounds; ++round) {
        const auto began = clock::now();
        work();
        best = std::max(best, symbols * 1e-6 / std::chrono::duration<double>(clock::now() - began).count());
    }
    return best;
}

} // namespace

int main(int count, char** arguments)
{
    const std::string path = std::string(count > 1 ? arguments[1] : "/tmp") + "/judge_speed.cf32";
    std::printf("Msymbol/s, file in memory, SER 1e-3\n    M     read    judge   watch::add   judge ÷ add\n");
    for (const char* name : {"qam:16", "qam:256"}) {
        const auto set = named_set(name);
        const pattern known("draw:7", set);
        std::vector<std::uint16_t> sent(symbols);
        known.indices(0, symbols, sent.data());
        std::vector<std::complex<float>> samples(symbols);
        for (std::size_t k = 0; k < symbols; ++k)
            samples[k] = std::complex<float>(set.points()[sent[k]]);
        kernels::complex_noise(1).add(
            0, symbols, set.es() / *predictor(set).es_n0_for_ser(1e-3), samples.data());
        std::ofstream(path, std::ios::binary)
            .write(reinterpret_cast<const char*>(samples.data()), static_cast<long>(symbols * 8));

        std::vector<std::complex<float>> piece(16384);
        const double read = best_speed([&] {
            recording from(path, "cf32_le");
            while (from.read(piece.data(), piece.size()) > 0) {
            }
        });
        const double judged = best_speed([&] {
            recording from(path, "cf32_le");
            judge_options options;
            options.watch.window = window_for(symbols);
            judge(from, set, known, std::move(options));
        });
        const std::vector<reference_t> reference(sent.begin(), sent.end());
        const double added = best_speed([&] {
            watch_options options;
            options.window = window_for(symbols);
            watch measured(set, options);
            for (std::size_t k = 0; k < symbols; k += 16384)
                measured.add(&samples[k], &reference[k], nullptr, 16384, [](watch::window&&) {});
        });
        std::printf("%5zu %8.1f %8.1f %12.1f %13.2f\n", set.size(), read, judged, added, judged / added);
    }
    std::remove(path.c_str());
}
