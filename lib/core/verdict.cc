// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: the bets, their wealth, and what it says.
#include "halfplane/verdict.h"

#include "refusal.h"
#include "verdict_side.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

namespace halfplane {

namespace {

constexpr double negative_infinity = -std::numeric_limits<double>::infinity();

// The mixture over bets. For `pass` the largest is nearly always the best: blocks are long, so their share of
// errors scatters little. For `fail` the best depends on how many errors come at once, so all count alike.
constexpr double boldest = 0.99; // of the bet that one full block would ruin
constexpr std::size_t pass_bets = 8;
constexpr double weight_of_boldest = 0.8;
constexpr double smallest_fail_bet = 0.1;

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

/// α is shared by the two kinds of wrong verdict.
double verdict::wealth_needed(const level& l) const
{
    return inflation(l) * std::log(2 / (1 - d_options.confidence));
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

/// What forbids a verdict whatever the wealth.
bool verdict::forbidden(const level& l, finding kind, std::uint64_t excluded) const
{
    if (kind == finding::fail)
        return l.errors < least_errors || l.hits < least_hits;
    const double all = static_cast<double>(d_steps) + static_cast<double>(excluded);
    return static_cast<double>(excluded) > d_options.max_excluded * all;
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
    if (*now.log_wealth_fail >= wealth_needed(l) && !forbidden(l, finding::fail, excluded))
        now.state = finding::fail;
    else if (*now.log_wealth_pass >= wealth_needed(l) && !forbidden(l, finding::pass, excluded))
        now.state = finding::pass;
    return now;
}

/// Above the wealth's logarithm: as if all terms of the mixture were as large as the largest.
double verdict::most_wealth(const side& s, std::size_t from) const
{
    const double step = std::log(1 - weight_of_shortest);
    double most = static_cast<double>(std::max(d_levels.size(), from)) * step;
    for (std::size_t at = from; at < d_levels.size(); ++at)
        for (std::size_t k = 0; k < s.clear.size(); ++k)
            most = std::max(most,
                            std::log(weight_of_shortest) + static_cast<double>(at) * step + s.log_weights[k] +
                                s.log_wealth(d_levels[at], k));
    return most + std::log(static_cast<double>((d_levels.size() - from) * s.clear.size() + 1));
}

finding verdict::state(std::uint64_t excluded) const
{
    // The choice of a length costs more than a bound on the wealth over all lengths, which mostly says
    // enough.
    if (d_levels.empty())
        return finding::undecided;
    const double least = std::log(2 / (1 - d_options.confidence));
    if (most_wealth(passing(), 0) < least && most_wealth(failing(), 0) < least)
        return finding::undecided;
    return look(excluded).state;
}

} // namespace halfplane
