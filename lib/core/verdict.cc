// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: the wealths, the choice of a block length, and how long it will take.
#include "halfplane/verdict.h"

#include "refusal.h"

#include <boost/math/special_functions/erf.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

namespace halfplane {

namespace {

constexpr double negative_infinity = -std::numeric_limits<double>::infinity();
constexpr std::size_t most_levels = 40;

// The mixture over bets. For `pass` the largest is nearly always the best: blocks are long, so their share of
// errors scatters little. For `fail` the best depends on how many errors come at once, so all count alike.
constexpr double boldest = 0.99; // of the bet that one full block would ruin
constexpr std::size_t pass_bets = 8;
constexpr double weight_of_boldest = 0.8;
constexpr double smallest_fail_bet = 0.1;

constexpr double weight_of_shortest = 0.8; // of the block lengths

// When adjacent blocks are said to err together.
constexpr double significance = 0.01;
constexpr double normal_quantile = 2.3263478740408408; // Φ^−1(1 − 0.01)
constexpr double least_correlation = 0.03;
constexpr double sparse_hits = 0.1; // share of hit blocks up to which their pairs are Poisson

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    detail::refuse<std::invalid_argument>(parts...);
}

double log_sum(const std::vector<double>& terms)
{
    const double top = *std::max_element(terms.begin(), terms.end());
    if (top == negative_infinity)
        return top;
    double sum = 0;
    for (double t : terms)
        sum += std::exp(t - top);
    return top + std::log(sum);
}

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

const char* to_string(finding f) noexcept
{
    switch (f) {
    case finding::pass:
        return "pass";
    case finding::fail:
        return "fail";
    case finding::undecided:
        break;
    }
    return "undecided";
}

/// One of the two games, so that both are played by the same code.
struct verdict::side {
    const std::vector<double>& clear;
    std::vector<double> log_weights;
    std::vector<double> level::*sums;
    std::vector<double> level::*squares;

    double log_wealth(const level& l, std::size_t bet) const
    {
        return static_cast<double>(l.blocks - l.hits) * clear[bet] + (l.*sums)[bet];
    }
};

verdict::side verdict::passing() const
{
    std::vector<double> weights(pass_bets, std::log((1 - weight_of_boldest) / (pass_bets - 1)));
    weights[0] = std::log(weight_of_boldest);
    return {d_pass_clear, weights, &level::pass, &level::pass_squares};
}

verdict::side verdict::failing() const
{
    const std::size_t n = d_fail_bets.size();
    return {d_fail_clear,
            std::vector<double>(n, -std::log(static_cast<double>(n))),
            &level::fail,
            &level::fail_squares};
}

verdict::verdict(verdict_options options) : d_options(options)
{
    const double p = d_options.target;
    if (!(p > 0 && p < 1))
        refuse("target must lie between 0 and 1, got ", p);
    if (!(d_options.confidence > 0 && d_options.confidence < 1))
        refuse("confidence must lie between 0 and 1, got ", d_options.confidence);
    if (d_options.dependence < 1 || d_options.dependence > std::uint64_t{1} << 32)
        refuse("dependence must be 1 … 2^32 steps, got ", d_options.dependence);
    if (d_options.errors_per_step < 1 || d_options.errors_per_step > std::uint64_t{1} << 32)
        refuse("errors_per_step must be 1 … 2^32, got ", d_options.errors_per_step);
    if (!(d_options.max_excluded >= 0 && d_options.max_excluded <= 1))
        refuse("max_excluded must lie in 0 … 1, got ", d_options.max_excluded);

    for (std::size_t k = 0; k < pass_bets; ++k)
        d_pass_bets.push_back(std::ldexp(boldest / (1 - p), -static_cast<int>(k)));
    for (double bet = boldest / p; d_fail_bets.empty() || bet > smallest_fail_bet; bet /= 2)
        d_fail_bets.push_back(bet);
    for (double bet : d_pass_bets)
        d_pass_clear.push_back(std::log1p(bet * p));
    for (double bet : d_fail_bets)
        d_fail_clear.push_back(std::log1p(-bet * p));
}

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

void verdict::add(std::uint64_t steps, std::uint64_t errors)
{
    const auto length = d_options.dependence;
    if (errors > 0) {
        if (steps > room())
            refuse("steps with errors must end within a block: ", steps, " steps, room for ", room());
        if (errors > steps * d_options.errors_per_step)
            refuse(errors, " errors in ", steps, " steps of ", d_options.errors_per_step);
    }
    d_steps += steps;
    if (steps >= room()) {
        steps -= room();
        d_open_errors += errors;
        if (d_open_errors > 0)
            close_hit(0, static_cast<double>(d_open_errors));
        else
            close_clear(0, 1);
        d_open_steps = d_open_errors = errors = 0;
        if (steps >= length)
            close_clear(0, steps / length);
        steps %= length;
    }
    d_open_steps += steps;
    d_open_errors += errors;
}

/// Blocks without errors, any number at once: two of one length make one of the next.
void verdict::close_clear(std::size_t at, std::uint64_t blocks)
{
    for (; blocks > 0 && at < most_levels; ++at) {
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
    for (; at < most_levels; ++at) {
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

bool verdict::hangs_together(const level& l)
{
    if (l.hits < 2)
        return false;
    const auto blocks = static_cast<double>(l.blocks), hits = static_cast<double>(l.hits);
    const double centre = l.errors * l.errors / blocks;
    const double spread = l.squares - centre;
    const double correlation = spread > 0 ? (l.products - centre) / spread : 0;
    if (correlation < least_correlation)
        return false;
    if (hits > sparse_hits * blocks && correlation * std::sqrt(blocks) > normal_quantile)
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

/// α is shared by the two kinds of wrong verdict.
double verdict::wealth_needed() const
{
    return std::log(2 / (1 - d_options.confidence));
}

double verdict::log_wealth(const side& s, std::size_t from) const
{
    std::vector<double> terms;
    const double step = std::log(1 - weight_of_shortest);
    for (std::size_t at = from; at < d_levels.size(); ++at)
        for (std::size_t k = 0; k < s.clear.size(); ++k)
            terms.push_back(std::log(weight_of_shortest) + static_cast<double>(at) * step + s.log_weights[k] +
                            s.log_wealth(d_levels[at], k));
    // Lengths without a block yet hold what they were given.
    terms.push_back(static_cast<double>(std::max(d_levels.size(), from)) * step);
    return log_sum(terms);
}

/// By the bet that gets there first at the growth it had so far.
std::optional<double> verdict::blocks_to_go(const side& s, std::size_t at) const
{
    const auto& l = d_levels[at];
    const auto blocks = static_cast<double>(l.blocks);
    // With errors the bets take turns and their common wealth is the nearest; without, each grows for itself.
    const double together = wealth_needed() - log_wealth(s, at);
    const double alone = wealth_needed() - std::log(weight_of_shortest) -
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

judgement verdict::look(std::uint64_t excluded) const
{
    judgement now;
    const auto at = free_level();
    if (!at)
        return now;
    const auto& l = d_levels[*at];
    now.block = d_options.dependence << *at;
    now.log_wealth_pass = log_wealth(passing(), *at);
    now.log_wealth_fail = log_wealth(failing(), *at);
    const double all = static_cast<double>(d_steps) + static_cast<double>(excluded);
    if (*now.log_wealth_fail >= wealth_needed() && l.errors >= least_errors && l.hits >= least_hits)
        now.state = finding::fail;
    else if (*now.log_wealth_pass >= wealth_needed() &&
             static_cast<double>(excluded) <= d_options.max_excluded * all)
        now.state = finding::pass;
    return now;
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

nlohmann::json verdict::save() const
{
    nlohmann::json levels = nlohmann::json::array();
    for (const auto& l : d_levels)
        levels.push_back({{"blocks", l.blocks},
                          {"hits", l.hits},
                          {"heavy", l.heavy},
                          {"heavy_pairs", l.heavy_pairs},
                          {"errors", l.errors},
                          {"squares", l.squares},
                          {"products", l.products},
                          {"last", l.last},
                          {"half", l.half},
                          {"waiting", l.waiting},
                          {"pass", l.pass},
                          {"pass_squares", l.pass_squares},
                          {"fail", l.fail},
                          {"fail_squares", l.fail_squares}});
    return {{"target", d_options.target},
            {"confidence", d_options.confidence},
            {"dependence", d_options.dependence},
            {"errors_per_step", d_options.errors_per_step},
            {"max_excluded", d_options.max_excluded},
            {"steps", d_steps},
            {"open_steps", d_open_steps},
            {"open_errors", d_open_errors},
            {"levels", std::move(levels)}};
}

void verdict::restore(const nlohmann::json& saved)
{
    const auto same = [&](const char* field, auto mine) {
        const auto theirs = saved.at(field).get<decltype(mine)>();
        if (theirs != mine)
            refuse("saved verdict: ", field, " is ", theirs, ", expected ", mine);
    };
    verdict fresh(d_options);
    try {
        same("target", d_options.target);
        same("confidence", d_options.confidence);
        same("dependence", d_options.dependence);
        same("errors_per_step", d_options.errors_per_step);
        same("max_excluded", d_options.max_excluded);
        saved.at("steps").get_to(fresh.d_steps);
        saved.at("open_steps").get_to(fresh.d_open_steps);
        saved.at("open_errors").get_to(fresh.d_open_errors);
        if (fresh.d_open_steps >= d_options.dependence)
            refuse("saved verdict: open_steps is ",
                   fresh.d_open_steps,
                   ", must be below ",
                   d_options.dependence);
        for (const auto& each : saved.at("levels")) {
            if (fresh.d_levels.size() == most_levels)
                refuse("saved verdict: more than ", most_levels, " levels");
            auto& l = fresh.level_at(fresh.d_levels.size());
            each.at("blocks").get_to(l.blocks);
            each.at("hits").get_to(l.hits);
            each.at("heavy").get_to(l.heavy);
            each.at("heavy_pairs").get_to(l.heavy_pairs);
            each.at("errors").get_to(l.errors);
            each.at("squares").get_to(l.squares);
            each.at("products").get_to(l.products);
            each.at("last").get_to(l.last);
            each.at("half").get_to(l.half);
            each.at("waiting").get_to(l.waiting);
            each.at("pass").get_to(l.pass);
            each.at("pass_squares").get_to(l.pass_squares);
            each.at("fail").get_to(l.fail);
            each.at("fail_squares").get_to(l.fail_squares);
            if (l.pass.size() != d_pass_bets.size() || l.pass_squares.size() != d_pass_bets.size() ||
                l.fail.size() != d_fail_bets.size() || l.fail_squares.size() != d_fail_bets.size() ||
                l.hits > l.blocks)
                refuse(
                    "saved verdict: level ", fresh.d_levels.size() - 1, " does not fit its bets or counts");
        }
    } catch (const nlohmann::json::exception& error) {
        refuse("saved verdict: ", error.what());
    }
    *this = std::move(fresh);
}

} // namespace halfplane
