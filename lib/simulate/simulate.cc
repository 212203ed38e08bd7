// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/simulate.h"

#include "halfplane/interval.h"
#include "link_model.h"
#include "ordered_work.h"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <limits>
#include <thread>

namespace halfplane {

namespace {

constexpr std::uint64_t run_length = 65536; // symbols; a multiple of link_model::block
constexpr double width_confidence = 0.95;

double seconds_since(std::chrono::steady_clock::time_point start)
{
    return std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
}

/// (high − low)/SER of the counts so far; infinite while there are no errors.
double relative_width(const tally& counts)
{
    if (counts.symbol_errors == 0)
        return std::numeric_limits<double>::infinity();
    const interval i = binomial_interval(counts.symbol_errors, counts.symbols, width_confidence);
    return (i.high - i.low.value_or(0)) * static_cast<double>(counts.symbols) /
           static_cast<double>(counts.symbol_errors);
}

/// Share of the work that is done, by the limit that is nearest. Widths shrink with the root of the count.
double fraction_done(const tally& counts, const simulation_options& o)
{
    double done = static_cast<double>(counts.symbols) / static_cast<double>(o.max_symbols);
    if (o.wanted_errors > 0)
        done =
            std::max(done, static_cast<double>(counts.symbol_errors) / static_cast<double>(o.wanted_errors));
    if (o.relative_width > 0 && counts.symbol_errors > 0)
        done = std::max(done, std::pow(o.relative_width / relative_width(counts), 2));
    return std::min(done, 1.0);
}

} // namespace

simulation
simulate(const signal_set& set, const simulation_options& options, const progress_callback& progress)
{
    const link_model link(set, options);
    const auto start = std::chrono::steady_clock::now();
    simulation result{tally(set), 0, false};
    const std::uint64_t runs = (options.max_symbols - 1) / run_length + 1;

    const auto make = [&](std::uint64_t run) {
        tally counts(set);
        const std::uint64_t first = run * run_length;
        link.count(first, std::min(run_length, options.max_symbols - first), counts);
        return counts;
    };
    const auto take = [&](tally&& counts) {
        result.counts.merge(counts);
        const bool enough =
            (options.wanted_errors > 0 && result.counts.symbol_errors >= options.wanted_errors) ||
            (options.relative_width > 0 && relative_width(result.counts) < options.relative_width);
        return !enough;
    };
    const auto watch = [&] {
        return !progress ||
               progress({result.counts, seconds_since(start), fraction_done(result.counts, options)});
    };
    const unsigned threads =
        options.threads ? options.threads : std::max(1u, std::thread::hardware_concurrency());
    result.cancelled = !run_in_order<tally>(threads, runs, make, take, watch);
    result.seconds = seconds_since(start);
    return result;
}

} // namespace halfplane
