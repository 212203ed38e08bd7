// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: how long it will take.
#include "halfplane/verdict.h"

#include "verdict_side.h"

#include <boost/math/special_functions/erf.hpp>

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane {

namespace {

double normal_cdf(double x)
{
    return boost::math::erfc(-x / std::sqrt(2.0)) / 2;
}

/// Median of the first passage of a walk of this drift and variance a step through `height`: of the inverse
/// Gaussian distribution with mean height/drift and shape height²/variance.
double median_passage(double height, double drift, double variance)
{
    const double mean = height / drift;
    const double shape = height * height / variance;
    if (!(shape < 1e8 * mean)) // the spread is below 1e-4 of the mean
        return mean;
    const auto below = [&](double t) {
        const double root = std::sqrt(shape / t);
        const double tail = normal_cdf(-root * (t / mean + 1));
        return normal_cdf(root * (t / mean - 1)) +
               (tail > 0 ? std::exp(2 * shape / mean + std::log(tail)) : 0);
    };
    double low = 0, high = mean; // the median lies below the mean
    for (int k = 0; k < 60; ++k) {
        const double middle = (low + high) / 2;
        (below(middle) < 0.5 ? low : high) = middle;
    }
    return high;
}

} // namespace

/// By the bet that gets there first at the growth it had so far.
std::optional<double> verdict::blocks_to_go(const side& s, std::size_t at) const
{
    const auto& l = d_levels[at];
    const auto blocks = static_cast<double>(l.blocks);
    // With errors the bets take turns and their common wealth is the nearest; without, each grows for itself.
    const double together = wealth_needed(l) - log_wealth(s, at);
    const double alone = wealth_needed(l) - std::log(weight_of_shortest) -
                         static_cast<double>(at) * std::log(1 - weight_of_shortest);
    std::optional<double> soonest;
    for (std::size_t k = 0; k < s.clear.size(); ++k) {
        const double wealth = s.log_wealth(l, k), drift = wealth / blocks;
        const double squares =
            static_cast<double>(l.blocks - l.hits) * s.clear[k] * s.clear[k] + (l.*s.squares)[k];
        const double variance = std::max(0.0, squares / blocks - drift * drift);
        if (!(drift > 2 * std::sqrt(variance / blocks))) // no growth beyond what luck would give
            continue;
        const double height = l.hits > 0 ? together : alone - s.log_weights[k] - wealth;
        const double time = height > 0 ? median_passage(height, drift, variance) : 1;
        if (!soonest || time < *soonest)
            soonest = time;
    }
    return soonest;
}

std::optional<std::uint64_t> verdict::steps_to_go(std::uint64_t excluded) const
{
    const auto now = look(excluded);
    if (now.block == 0 || now.state != finding::undecided)
        return std::nullopt;
    const auto at = *free_level();
    const auto to_pass = blocks_to_go(passing(), at), to_fail = blocks_to_go(failing(), at);
    if (!to_pass && !to_fail)
        return std::nullopt;
    const double none = std::numeric_limits<double>::infinity();
    const double blocks = std::ceil(std::min(to_pass.value_or(none), to_fail.value_or(none)));
    const double steps = blocks * static_cast<double>(now.block);
    return steps < 1e18 ? std::optional(static_cast<std::uint64_t>(steps)) : std::nullopt;
}

} // namespace halfplane
