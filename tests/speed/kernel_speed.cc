// SPDX-License-Identifier: GPL-3.0-or-later
// kernel_speed: prints the speed of the kernels and of the simulator beside what one would otherwise use, in
// one run.
#include "../kernels/sample_sets.h"
#include "halfplane/kernels/detect.h"
#include "halfplane/kernels/error_count.h"
#include "halfplane/kernels/llr.h"
#include "halfplane/kernels/noise.h"
#include "halfplane/kernels/random_words.h"
#include "halfplane/kernels/target.h"
#include "halfplane/rates.h"
#include "halfplane/simulate.h"
#ifdef HALFPLANE_HOST
#include "host_detector.h"
#endif

#include <benchmark/benchmark.h>

#include <algorithm>
#include <cstdio>
#include <map>
#include <string>
#include <thread>
#include <vector>

using namespace halfplane;
using sample = std::complex<float>;

namespace {

constexpr std::size_t block = 1 << 16;

/// Keeps the best rate of the repetitions by name and prints nothing itself.
class collector final : public benchmark::BenchmarkReporter
{
public:
    std::map<std::string, double> millions;
    bool ReportContext(const Context&) override { return true; }
    void ReportRuns(const std::vector<Run>& runs) override
    {
        for (const Run& run : runs) {
            const auto rate = run.counters.find("items_per_second");
            if (run.run_type == Run::RT_Iteration && rate != run.counters.end()) {
                double& best = millions[run.run_name.function_name];
                best = std::max(best, rate->second.value / 1e6);
            }
        }
    }
};

enum class clock_of { processor, wall };

/// Times `work`, which handles `items` a call: by the processor's time, which other programs lengthen least,
/// unless it runs on threads of its own.
template <typename Work>
void time(const std::string& name,
          std::size_t items,
          Work work,
          double seconds = 0.05,
          clock_of by = clock_of::processor)
{
    const auto timed = benchmark::RegisterBenchmark(name.c_str(), [=](benchmark::State& state) {
        for (auto _ : state)
            work();
        state.SetItemsProcessed(static_cast<std::int64_t>(state.iterations() * items));
    });
    timed->MinTime(seconds)->Repetitions(5);
    if (by == clock_of::wall)
        timed->UseRealTime();
}

/// Samples of a set at SER ≈ 1e-2, and what there is to do with them.
struct workload {
    explicit workload(const signal_set& s)
        : set(s), es_n0(predictor(s).es_n0_for_ser(1e-2).value()), in(block), decided(block),
          soft(block * s.label_bits())
    {
        std::vector<std::uint32_t> word(block);
        kernels::random_words(5, 1).draw(0, block, word.data());
        for (std::size_t k = 0; k < block; ++k)
            in[k] = sample(set.points()[word[k] % set.size()]);
        kernels::complex_noise(5).add(0, block, n0(), in.data());
    }
    double n0() const { return set.es() / es_n0; }
    /// The loop one would write: all points in float, the smallest distance.
    void plain(std::size_t count)
    {
        std::vector<float> re, im;
        for (const complex s : set.points())
            re.push_back(static_cast<float>(s.real())), im.push_back(static_cast<float>(s.imag()));
        for (std::size_t k = 0; k < count; ++k) {
            float least = 3e38f;
            std::uint16_t best = 0;
            for (std::size_t i = 0; i < re.size(); ++i) {
                const float x = in[k].real() - re[i], y = in[k].imag() - im[i], d = x * x + y * y;
                if (d < least)
                    least = d, best = static_cast<std::uint16_t>(i);
            }
            decided[k] = best;
        }
    }
    signal_set set;
    double es_n0;
    std::vector<sample> in;
    std::vector<std::uint16_t> decided;
    std::vector<float> soft;
};

/// One line of the summary: a figure, what is wanted of it, and whether it is met.
void summarise(const std::string& figure, double value, double wanted)
{
    std::printf("%-44s %9.2f %9.2f  %s\n", figure.c_str(), value, wanted, value >= wanted ? "met" : "missed");
}

double of(const std::map<std::string, double>& rates, const std::string& name)
{
    const auto found = rates.find(name);
    return found == rates.end() ? 0 : found->second;
}

} // namespace

int main(int argc, char** argv)
{
    benchmark::Initialize(&argc, argv);
    using namespace sample_sets;
    std::vector<std::unique_ptr<workload>> loads;
    for (const signal_set& set :
         {ring(4),      ring(8),    two_rings(4, 8, 2.1), grid(4, 4),   ring(16),   random(16, 1),
          grid(8, 4),   ring(32),   random(32, 1),        grid(8, 8),   ring(64),   random(64, 1),
          grid(16, 16), ring(256),  random(256, 1),       grid(32, 32), ring(1024), random(1024, 1),
          grid(64, 64), ring(4096), random(4096, 1)})
        loads.push_back(std::make_unique<workload>(set));

    std::vector<std::string> hard, soft;
    for (const auto& held : loads) {
        workload* const w = held.get();
        const std::string& name = w->set.name();
        hard.push_back(name);
        const auto decider = std::make_shared<kernels::point_decider>(w->set);
        time("detect " + name, block, [=] { decider->decide(w->in.data(), w->decided.data(), block); });
        const std::size_t few = std::min<std::size_t>(block, 4000000 / w->set.size() + 1);
        time("plain " + name, few, [=] { w->plain(few); });
        const bool with_soft = name == "grid-4x4" || name == "grid-8x8" || name == "grid-16x16";
        if (with_soft) {
            soft.push_back(name);
            for (const auto rule : {kernels::llr_rule::exact, kernels::llr_rule::max_log}) {
                const auto llr = std::make_shared<kernels::llr_decider>(
                    w->set, w->n0(), kernels::llr_options{rule, kernels::llr_sign::positive_is_0, 1e6f});
                time((rule == kernels::llr_rule::exact ? "exact " : "max-log ") + name, block, [=] {
                    llr->decide(w->in.data(), w->soft.data(), block);
                });
            }
        }
#ifdef HALFPLANE_HOST
        if (w->set.size() <= 1024 && name.substr(0, 4) == "grid") {
            const auto host = std::make_shared<host_detector>(w->set.points());
            const std::size_t n = std::min<std::size_t>(block, 1000000 / w->set.size());
            time("host hard " + name, n, [=] { benchmark::DoNotOptimize(host->hard(w->in.data(), n)); });
            if (with_soft)
                time("host soft " + name, n / 8, [=] {
                    benchmark::DoNotOptimize(host->soft(w->in.data(), n / 8));
                });
        }
#endif
    }
    std::vector<sample> noise(block);
    std::vector<std::uint32_t> words(block);
    time("complex normals", block, [&] { kernels::complex_noise(1).draw(0, block, 1.0, noise.data()); });
    time("random words", block, [&] { kernels::random_words(1).draw(0, block, words.data()); });
    std::vector<std::uint16_t> sent(block, 5), received(block, 5);
    for (std::size_t k = 0; k < block; k += 100)
        received[k] = 6;
    time("compared labels", block, [&] {
        kernels::label_errors counts;
        kernels::count_label_errors(sent.data(), received.data(), block, counts);
        benchmark::DoNotOptimize(counts);
    });
    const workload* const square = loads[3].get();
    constexpr std::uint64_t symbols =
        64'000'000; // a third of a second: setting up is no part worth speaking of
    for (const unsigned threads : {1u, 2u})
        time(
            "simulator on " + std::to_string(threads),
            symbols,
            [=] {
                simulation_options options;
                options.es_n0 = square->es_n0;
                options.wanted_errors = 0;
                options.max_symbols = symbols;
                options.threads = threads;
                benchmark::DoNotOptimize(simulate(square->set, options).counts.symbol_errors);
            },
            0.3,
            clock_of::wall);

    collector results;
    benchmark::RunSpecifiedBenchmarks(&results);
    const auto& r = results.millions;

    std::printf("instruction set: %s\n\nhard decisions at SER 1e-2, Msymbol/s\n%-12s %9s %11s %7s %11s %7s\n",
                kernels::target().c_str(),
                "set",
                "kernel",
                "plain loop",
                "ratio",
                "host",
                "ratio");
    double fastest = 0, slowest = 1e9;
    for (const std::string& name : hard) {
        const double kernel = of(r, "detect " + name), plain = of(r, "plain " + name),
                     host = of(r, "host hard " + name);
        fastest = std::max(fastest, kernel), slowest = std::min(slowest, kernel);
        std::printf("%-12s %9.1f %11.2f %7.1f", name.c_str(), kernel, plain, kernel / plain);
        if (host > 0)
            std::printf(" %11.3f %7.0f", host, kernel / host);
        std::printf("\n");
    }
    std::printf("slowest / fastest: %.2f\n\nlog-likelihood ratios, Msymbol/s\n%-12s %9s %9s %7s %11s %7s\n",
                slowest / fastest,
                "set",
                "exact",
                "max-log",
                "ratio",
                "host",
                "ratio");
    for (const std::string& name : soft) {
        const double exact = of(r, "exact " + name), rough = of(r, "max-log " + name),
                     host = of(r, "host soft " + name);
        std::printf("%-12s %9.2f %9.2f %7.2f", name.c_str(), exact, rough, rough / exact);
        if (host > 0)
            std::printf(" %11.4f %7.0f", host, exact / host);
        std::printf("\n");
    }
    std::printf("\n");
    for (const char* name : {"complex normals", "random words", "compared labels"})
        std::printf("%-24s %9.1f M/s\n", name, of(r, name));
    const double one = of(r, "simulator on 1"), two = of(r, "simulator on 2");
    std::printf(
        "\nsimulator, grid-4x4, all in: %.1f Msymbol/s on one thread, %.1f on two (%.2f x, %u cores here)\n",
        one,
        two,
        two / one,
        std::thread::hardware_concurrency());
    std::fflush(stdout);
    double over_numpy = 0;
#ifdef HALFPLANE_NUMPY_SIMULATION
    if (std::FILE* numpy = popen(HALFPLANE_NUMPY_SIMULATION, "r")) {
        double rate = 0;
        if (std::fscanf(numpy, "%lf", &rate) == 1 && rate > 0) {
            over_numpy = one / rate;
            std::printf(
                "numpy: %.2f Msymbol/s, the simulator on one thread %.0f x as fast\n", rate, over_numpy);
        }
        pclose(numpy);
    }
#endif

    std::printf("\n%-44s %9s %9s\n", "figure", "measured", "wanted");
    summarise("slowest hard decision, Msymbol/s", slowest, 200);
    summarise("slowest / fastest hard decision", slowest / fastest, 0.4);
    const std::pair<const char*, double> hard_ratios[] = {
        {"grid-4x4", 20}, {"grid-8x8", 100}, {"grid-32x32", 800}};
    for (const auto& [name, wanted] : hard_ratios)
        if (const double host = of(r, std::string("host hard ") + name); host > 0)
            summarise(
                std::string("hard / host, ") + name, of(r, std::string("detect ") + name) / host, wanted);
    for (const std::string& name : soft)
        if (const double host = of(r, "host soft " + name); host > 0)
            summarise("exact ratios / host, " + name, of(r, "exact " + name) / host, 30);
    for (const std::string& name : soft)
        summarise("max-log / exact, " + name, of(r, "max-log " + name) / of(r, "exact " + name), 2);
    summarise("complex normals, M/s", of(r, "complex normals"), 100);
    summarise("simulator on one thread, Msymbol/s", one, 45);
    summarise("simulator, two threads / one", two / one, 1.85);
    if (over_numpy > 0)
        summarise("simulator on one thread / numpy", over_numpy, 15);
    std::printf(
        "Kernels by the processor's time, simulator and numpy by the wall: busy cores shrink the latter.\n");
}
