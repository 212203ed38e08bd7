// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: the blocks of every length, and whether adjacent ones err together.
#include "halfplane/verdict.h"

#include "verdict_side.h"

#include <boost/math/special_functions/gamma.hpp>

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

// When adjacent blocks are said to err together.
constexpr double significance = 0.01;
constexpr double normal_quantile = 2.3263478740408408; // Φ^−1(1 − 0.01)
constexpr double least_correlation = 0.03;
constexpr double unseen = 2;                // standard errors
constexpr double tail_of_correlation = 2.5; // 2Σr_k / r_1
constexpr double sparse_hits = 0.1;         // share of hit blocks up to which their pairs are Poisson

} // namespace

verdict::level& verdict::level_at(std::size_t at)
{
    if (at == d_levels.size()) {
        level fresh;
        fresh.pass.assign(d_pass_bets.size(), 0);
        fresh.pass_squares = fresh.pass;
        fresh.fail.assign(d_fail_bets.size(), 0);
        fresh.fail_squares = fresh.fail;
        d_levels.push_back(std::move(fresh));
    }
    return d_levels[at];
}

/// Blocks without errors, any number at once: two of one length make one of the next.
void verdict::close_clear(std::size_t at, std::uint64_t blocks)
{
    for (; blocks > 0 && at < most_verdict_levels; ++at) {
        auto& l = level_at(at);
        l.blocks += blocks;
        l.last = 0;
        std::uint64_t wider = 0;
        if (l.waiting) {
            l.waiting = false;
            --blocks;
            if (l.half > 0)
                close_hit(at + 1, l.half);
            else
                ++wider;
        }
        auto& again = d_levels[at]; // close_hit may have moved it
        wider += blocks / 2;
        if (blocks % 2 == 1) {
            again.waiting = true;
            again.half = 0;
        }
        blocks = wider;
    }
}

void verdict::close_hit(std::size_t at, double errors)
{
    const double p = d_options.target;
    for (; at < most_verdict_levels; ++at) {
        auto& l = level_at(at);
        const double length = std::ldexp(static_cast<double>(d_options.dependence), static_cast<int>(at)) *
                              static_cast<double>(d_options.errors_per_step);
        const double share = errors / length;
        ++l.blocks;
        ++l.hits;
        for (std::size_t i = 0; i < sizes && errors >= std::ldexp(1, static_cast<int>(i)); ++i) {
            ++l.heavy[i];
            l.heavy_pairs[i] += l.last >= std::ldexp(1, static_cast<int>(i));
        }
        l.errors += errors;
        l.squares += errors * errors;
        l.products += errors * l.last;
        l.last = errors;
        const auto bet_on = [](double edge, const std::vector<double>& bets, auto& sums, auto& squares) {
            for (std::size_t k = 0; k < bets.size(); ++k) {
                const double won = std::log1p(bets[k] * edge);
                sums[k] += won;
                squares[k] += won * won;
            }
        };
        bet_on(p - share, d_pass_bets, l.pass, l.pass_squares);
        bet_on(share - p, d_fail_bets, l.fail, l.fail_squares);
        l.waiting = !l.waiting;
        if (l.waiting) {
            l.half = errors;
            return;
        }
        errors += l.half;
    }
}

/// Serial correlation of the errors of adjacent blocks; 0 where none was seen to differ from another.
double verdict::correlation(const level& l)
{
    const double centre = l.errors * l.errors / static_cast<double>(l.blocks);
    const double spread = l.squares - centre;
    return spread > 0 ? (l.products - centre) / spread : 0;
}

bool verdict::hangs_together(const level& l)
{
    if (l.hits < 2)
        return false;
    const auto blocks = static_cast<double>(l.blocks), hits = static_cast<double>(l.hits);
    const double r = correlation(l);
    if (r < least_correlation)
        return false;
    if (hits > sparse_hits * blocks && r * std::sqrt(blocks) > normal_quantile)
        return true;
    for (std::size_t i = 0; i < sizes && l.heavy_pairs[i] > 0; ++i) {
        const auto heavy = static_cast<double>(l.heavy[i]);
        if (heavy <= sparse_hits * blocks && boost::math::gamma_p(static_cast<double>(l.heavy_pairs[i]),
                                                                  heavy * heavy / blocks) < significance)
            return true;
    }
    return false;
}

std::optional<std::size_t> verdict::free_level() const
{
    for (std::size_t at = 0; at < d_levels.size() && d_levels[at].blocks >= least_blocks; ++at)
        if (!hangs_together(d_levels[at]))
            return at;
    return std::nullopt;
}

/*!
 * What dependence that is there and not significant yet can do. A walk whose steps have serial correlation r
 * scatters as one of 1 + 2Σr_k times the variance, and a walk of c times the variance reaches the height h
 * with the chance e^(−h/c) instead of e^(−h). So the height is raised by the c of the largest r that the
 * blocks seen so far do not contradict.
 */
double verdict::inflation(const level& l)
{
    if (l.hits < 2)
        return 1;
    const double most = correlation(l) + unseen / std::sqrt(static_cast<double>(l.blocks));
    return 1 + tail_of_correlation * std::max(0.0, most);
}

} // namespace halfplane
