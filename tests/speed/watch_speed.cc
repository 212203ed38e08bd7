// SPDX-License-Identifier: GPL-3.0-or-later
// Benchmark: what gathering for losses and premises costs the stream. Run by hand:
// build/tests/speed/watch_speed
#include "halfplane/kernels/noise.h"
#include "halfplane/link/watch.h"
#include "halfplane/set_file.h"

#include <chrono>
#include <cstdio>
#include <string>
#include <vector>

using namespace halfplane;
using namespace halfplane::link;

namespace {

using clock_type = std::chrono::steady_clock;

struct stream {
    std::vector<std::complex<float>> samples;
    std::vector<reference_t> reference;
};

stream at_ser_of_a_hundredth(const signal_set& set)
{
    stream s;
    const std::size_t n = 1 << 20;
    std::uint64_t random = 1;
    for (std::size_t k = 0; k < n; ++k) {
        random = random * 6364136223846793005u + 1442695040888963407u;
        s.reference.push_back(static_cast<reference_t>((random >> 33) % set.size()));
        s.samples.emplace_back(set.points()[static_cast<std::size_t>(s.reference.back())]);
    }
    kernels::complex_noise(1).add(0, n, set.es() / *predictor(set).es_n0_for_ser(1e-2), s.samples.data());
    return s;
}

/// Msymbol/s of watch::add, windows dropped: the best of nine rounds.
double speed(const signal_set& set, const stream& s, bool explain)
{
    watch_options options;
    options.window = 100000;
    options.explain = explain;
    watch measured(set, options);
    double best = 0;
    for (int round = 0; round < 9; ++round) {
        const auto began = clock_type::now();
        for (std::size_t k = 0; k < s.samples.size(); k += 4096)
            measured.add(&s.samples[k], &s.reference[k], nullptr, 4096, [](watch::window&&) {});
        const double seconds = std::chrono::duration<double>(clock_type::now() - began).count();
        best = std::max(best, static_cast<double>(s.samples.size()) * 1e-6 / seconds);
    }
    return best;
}

} // namespace

int main()
{
    std::printf("watch::add, one core, SER 1e-2\n    M   Msymbol/s   without explain   ratio\n");
    for (const char* name : {"qam:16", "qam:256", "qam:4096"}) {
        const auto set = named_set(name);
        const auto s = at_ser_of_a_hundredth(set);
        const double with = speed(set, s, true), without = speed(set, s, false);
        std::printf("%5zu %11.1f %17.1f %7.2f\n", set.size(), with, without, with / without);
    }
}
