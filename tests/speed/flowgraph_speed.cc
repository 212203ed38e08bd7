// SPDX-License-Identifier: GPL-3.0-or-later
// Benchmark: detection as a kernel, as a block in a flowgraph and as a plain loop, beside the host's copy
// block; and the time of a 50-point curve. Run by hand: build/tests/speed/flowgraph_speed
#include "halfplane/kernels/detect.h"
#include "halfplane/kernels/noise.h"
#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <gnuradio/blocks/copy.h>
#include <gnuradio/blocks/head.h>
#include <gnuradio/blocks/null_sink.h>
#include <gnuradio/blocks/vector_source.h>
#include <gnuradio/halfplane/point_detector.h>
#include <gnuradio/top_block.h>

#include <benchmark/benchmark.h>

#include <cmath>
#include <complex>
#include <string>
#include <vector>

namespace {

using halfplane::signal_set;
using samples = std::vector<std::complex<float>>;

signal_set square_set(std::int64_t points)
{
    return halfplane::named_set(points == 8 ? "psk:8" : "qam:" + std::to_string(points));
}

/// 65,536 noisy points, at the Es/N0 where one in a hundred is decided wrongly.
samples noisy(const signal_set& set)
{
    const halfplane::predictor rates(set);
    const double n0 = set.es() / *rates.es_n0_for_ser(1e-2);
    samples out(1 << 16);
    halfplane::kernels::complex_noise(1).draw(0, out.size(), n0, out.data());
    for (std::size_t k = 0; k < out.size(); ++k)
        out[k] += std::complex<float>(set.points()[k * 2654435761u % set.size()]);
    return out;
}

void count(benchmark::State& state, std::uint64_t symbols_a_round)
{
    state.counters["Msymbol/s"] = benchmark::Counter(static_cast<double>(symbols_a_round) * 1e-6,
                                                     benchmark::Counter::kIsIterationInvariantRate);
}

void kernel(benchmark::State& state)
{
    const auto set = square_set(state.range(0));
    const halfplane::kernels::point_decider decider(set);
    const auto in = noisy(set);
    std::vector<std::uint16_t> out(in.size());
    for (auto _ : state) {
        decider.decide(in.data(), out.data(), in.size());
        benchmark::DoNotOptimize(out.data());
    }
    count(state, in.size());
}

/// All points, double precision: what the kernel must agree with.
void plain_loop(benchmark::State& state)
{
    const auto set = square_set(state.range(0));
    const halfplane::kernels::point_decider decider(set);
    const auto in = noisy(set);
    const std::size_t some = 4096;
    std::vector<std::uint16_t> out(some);
    for (auto _ : state) {
        decider.decide_reference(in.data(), out.data(), some);
        benchmark::DoNotOptimize(out.data());
    }
    count(state, some);
}

/// source → tested → head → sink, the scheduler included.
void run_flowgraph(benchmark::State& state,
                   const signal_set& set,
                   const gr::basic_block_sptr& tested,
                   std::size_t item)
{
    constexpr std::uint64_t symbols = 20'000'000;
    const auto in = noisy(set);
    for (auto _ : state) {
        auto top = gr::make_top_block("speed");
        auto source = gr::blocks::vector_source_c::make({in.begin(), in.end()}, true);
        auto head = gr::blocks::head::make(item, symbols);
        top->connect(source, 0, tested, 0);
        top->connect(tested, 0, head, 0);
        top->connect(head, 0, gr::blocks::null_sink::make(item), 0);
        top->run();
    }
    count(state, symbols);
}

void block_in_flowgraph(benchmark::State& state)
{
    const auto set = square_set(state.range(0));
    run_flowgraph(state, set, gr::halfplane::point_detector::make(set), sizeof(short));
}

void host_copy_in_flowgraph(benchmark::State& state)
{
    run_flowgraph(state, square_set(16), gr::blocks::copy::make(sizeof(gr_complex)), sizeof(gr_complex));
}

/// SER and BER on every rung at 50 values of Es/N0, cells included.
void curve_of_50(benchmark::State& state)
{
    const auto set = square_set(state.range(0));
    for (auto _ : state) {
        const halfplane::predictor rates(set);
        for (int k = 0; k < 50; ++k)
            benchmark::DoNotOptimize(rates.at(halfplane::from_db(0.6 * k)).exact.ber);
    }
}

const std::vector<std::int64_t> sizes{8, 16, 64, 256, 1024};

void all_sizes(benchmark::internal::Benchmark* b)
{
    for (const auto m : sizes)
        b->Arg(m);
}

} // namespace

BENCHMARK(kernel)->Apply(all_sizes);
BENCHMARK(plain_loop)->Apply(all_sizes);
BENCHMARK(block_in_flowgraph)->Apply(all_sizes)->UseRealTime()->Unit(benchmark::kMillisecond);
BENCHMARK(host_copy_in_flowgraph)->UseRealTime()->Unit(benchmark::kMillisecond);
BENCHMARK(curve_of_50)->Arg(16)->Arg(64)->Arg(256)->Unit(benchmark::kMillisecond);
BENCHMARK_MAIN();
