// SPDX-License-Identifier: GPL-3.0-or-later
// core_speed: times of cells, curves and transition matrices, beside a plain loop over all edges.
#include "halfplane/cells.h"
#include "halfplane/rates.h"
#include "halfplane/wedge.h"

#include <benchmark/benchmark.h>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <map>
#include <random>
#include <string>
#include <vector>

using namespace halfplane;

namespace {

signal_set square(std::size_t m)
{
    const auto n = static_cast<std::size_t>(std::lround(std::sqrt(m)));
    const auto bits = static_cast<unsigned>(std::lround(std::log2(n)));
    std::vector<complex> points;
    std::vector<label_t> labels;
    for (std::size_t q = 0; q < n; ++q)
        for (std::size_t i = 0; i < n; ++i) {
            points.emplace_back(2.0 * i - n + 1, 2.0 * q - n + 1);
            labels.push_back(static_cast<label_t>((q ^ q >> 1) << bits | (i ^ i >> 1)));
        }
    return {std::move(points), std::move(labels), 2 * bits};
}

signal_set scattered(std::size_t m)
{
    std::mt19937_64 draw(m);
    std::normal_distribution<double> normal;
    std::vector<complex> points;
    for (std::size_t i = 0; i < m; ++i)
        points.emplace_back(normal(draw), normal(draw));
    return signal_set::with_natural_labels(std::move(points));
}

signal_set hexagonal(std::size_t m)
{
    std::vector<complex> points;
    for (int a = -40; a <= 40; ++a)
        for (int b = -40; b <= 40; ++b)
            points.emplace_back(a + 0.5 * b, b * std::sqrt(0.75));
    std::nth_element(points.begin(),
                     points.begin() + static_cast<std::ptrdiff_t>(m),
                     points.end(),
                     [](complex x, complex y) { return std::norm(x) < std::norm(y); });
    points.resize(m);
    return signal_set::with_natural_labels(std::move(points));
}

/// 50 levels from where nearly every symbol errs to where hardly one does (SER near 0.9 down to 1e-9).
std::vector<double> levels(const predictor& p)
{
    const double first = to_db(*p.es_n0_for_ser(0.3)) - 6, last = to_db(*p.es_n0_for_ser(1e-9));
    std::vector<double> out;
    for (int k = 0; k < 50; ++k)
        out.push_back(from_db(first + (last - first) * k / 49));
    return out;
}

template <signal_set (*make)(std::size_t)>
void build_cells(benchmark::State& state)
{
    const auto set = make(static_cast<std::size_t>(state.range(0)));
    const auto scaled = set.scaled(1 / std::sqrt(set.es()));
    for (auto _ : state)
        benchmark::DoNotOptimize(cells(scaled.points()).edges().size());
}

template <signal_set (*make)(std::size_t)>
void ser_curve_50(benchmark::State& state)
{
    const predictor p(make(static_cast<std::size_t>(state.range(0))));
    const auto at = levels(p);
    for (auto _ : state)
        for (const double es_n0 : at)
            benchmark::DoNotOptimize(p.ser(es_n0));
}

template <signal_set (*make)(std::size_t)>
void ber_curve_50(benchmark::State& state)
{
    const predictor p(make(static_cast<std::size_t>(state.range(0))));
    const auto at = levels(p);
    for (auto _ : state)
        for (const double es_n0 : at)
            benchmark::DoNotOptimize(p.ber(es_n0));
}

/// The reference: every edge of every cell, one wedge each, nothing grouped and nothing left out.
template <signal_set (*make)(std::size_t)>
void plain_ber_curve_50(benchmark::State& state)
{
    const auto set = make(static_cast<std::size_t>(state.range(0)));
    const predictor p(set);
    const auto at = levels(p);
    const cells regions(set.points());
    for (auto _ : state)
        for (const double es_n0 : at) {
            const double k = std::sqrt(2 * es_n0 / set.es());
            double sum = 0;
            for (std::size_t i = 0; i < set.size(); ++i)
                for (const auto& e : regions.edges()) {
                    const auto v = e.seen_from(set.points()[i]);
                    const int here = static_cast<int>(label_distance(set.labels()[i], set.labels()[e.inner]));
                    const int there =
                        static_cast<int>(label_distance(set.labels()[i], set.labels()[e.outer]));
                    const double mass = wedge(std::abs(v.height) * k, v.from * k, v.to * k).value();
                    sum += (v.height >= 0 ? there - here : here - there) * mass;
                }
            benchmark::DoNotOptimize(sum);
        }
}

template <signal_set (*make)(std::size_t)>
void all_transitions(benchmark::State& state)
{
    const predictor p(make(static_cast<std::size_t>(state.range(0))));
    const double es_n0 = *p.es_n0_for_ser(1e-3);
    for (auto _ : state)
        benchmark::DoNotOptimize(p.transitions(es_n0).data());
}

template <signal_set (*make)(std::size_t)>
void all_rungs(benchmark::State& state)
{
    const predictor p(make(static_cast<std::size_t>(state.range(0))));
    const double es_n0 = *p.es_n0_for_ser(1e-3);
    for (auto _ : state)
        benchmark::DoNotOptimize(p.at(es_n0).exact.ser);
}

void map_at_one_level(benchmark::State& state)
{
    const auto m = static_cast<std::size_t>(state.range(0));
    std::vector<double> priors(m);
    double sum = 0;
    const auto set = square(m);
    for (std::size_t i = 0; i < m; ++i)
        sum += priors[i] = std::exp(-std::norm(set.points()[i]) / set.es());
    for (double& p : priors)
        p /= sum;
    const predictor p(set.with_priors(priors));
    const double es_n0 = *p.es_n0_for_ser(1e-3);
    for (auto _ : state)
        benchmark::DoNotOptimize(p.at(es_n0).exact.ser);
}

void one_wedge(benchmark::State& state)
{
    const double h = static_cast<double>(state.range(0)) / 10;
    for (auto _ : state)
        benchmark::DoNotOptimize(wedge(h, -0.7 * h - 0.1, 1.3 * h + 0.2).integral);
}

} // namespace

BENCHMARK(one_wedge)->Arg(1)->Arg(10)->Arg(30)->Arg(100);
BENCHMARK_TEMPLATE(build_cells, square)->RangeMultiplier(4)->Range(16, 4096)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(build_cells, hexagonal)->Arg(1024)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(build_cells, scattered)->Arg(1024)->Arg(4096)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(ser_curve_50, square)->RangeMultiplier(4)->Range(16, 4096)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(ser_curve_50, hexagonal)->Arg(1024)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(ser_curve_50, scattered)->Arg(4096)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(ber_curve_50, square)->RangeMultiplier(4)->Range(16, 4096)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(ber_curve_50, hexagonal)->Arg(1024)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(ber_curve_50, scattered)->Arg(1024)->Arg(4096)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(plain_ber_curve_50, square)->Arg(16)->Arg(64)->Arg(256)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(all_transitions, square)->Arg(64)->Arg(256)->Unit(benchmark::kMillisecond);
BENCHMARK_TEMPLATE(all_rungs, square)->Arg(16)->Arg(256)->Arg(4096)->Unit(benchmark::kMillisecond);
BENCHMARK(map_at_one_level)->Arg(64)->Arg(256)->Unit(benchmark::kMillisecond);

namespace {

/// Keeps what was measured, for the summary.
class keeping : public benchmark::ConsoleReporter
{
public:
    void ReportRuns(const std::vector<Run>& runs) override
    {
        for (const auto& run : runs)
            cpu_ms[run.benchmark_name()] =
                run.cpu_accumulated_time / static_cast<double>(run.iterations) * 1e3;
        ConsoleReporter::ReportRuns(runs);
    }
    std::map<std::string, double> cpu_ms;
};

void summary(const std::map<std::string, double>& cpu_ms)
{
    struct {
        const char* name;
        double at_most;
    } const wanted[] = {{"build_cells<scattered>/4096", 40},
                        {"ser_curve_50<square>/64", 0.6},
                        {"ser_curve_50<square>/4096", 30},
                        {"ber_curve_50<square>/64", 8},
                        {"ber_curve_50<square>/1024", 150},
                        {"ber_curve_50<square>/4096", 700},
                        {"all_transitions<square>/256", 10}};
    std::printf("\n%-32s %10s %10s\n", "CPU, ms", "measured", "at most");
    for (const auto& w : wanted)
        if (const auto found = cpu_ms.find(w.name); found != cpu_ms.end())
            std::printf("%-32s %10.3f %10.1f\n", w.name, found->second, w.at_most);

    const auto ratio = [&](const std::string& a, const std::string& b, const char* what) {
        if (cpu_ms.count(a) && cpu_ms.count(b))
            std::printf("%-66s %8.2f  %s\n", (a + " / " + b).c_str(), cpu_ms.at(a) / cpu_ms.at(b), what);
    };
    std::printf("\nratios\n");
    for (const char* m : {"16", "64", "256"})
        ratio("plain_ber_curve_50<square>/" + std::string(m),
              "ber_curve_50<square>/" + std::string(m),
              "times the plain loop");
    ratio("ber_curve_50<square>/4096", "ber_curve_50<square>/1024", "at most 8: M·√M");
    ratio("ber_curve_50<scattered>/4096", "ber_curve_50<scattered>/1024", "at most 8: M·√M");
}

} // namespace

int main(int argc, char** argv)
{
    benchmark::Initialize(&argc, argv);
    if (benchmark::ReportUnrecognizedArguments(argc, argv))
        return 1;
    keeping reporter;
    benchmark::RunSpecifiedBenchmarks(&reporter);
    summary(reporter.cpu_ms);
}
