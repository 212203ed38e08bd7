// SPDX-License-Identifier: GPL-3.0-or-later
// planning: the binomial distribution function through the incomplete beta function, and its inverses.
#include "halfplane/planning.h"

#include "refusal.h"

#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <cmath>
#include <stdexcept>

namespace halfplane {

namespace {

constexpr double most_trials = 1e19;

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    detail::refuse<std::invalid_argument>(parts...);
}

void require_inside(const char* name, double value)
{
    if (!(value > 0 && value < 1))
        refuse(name, " must lie between 0 and 1, got ", value);
}

void require_test(const count_test& test)
{
    if (test.allowed >= test.trials)
        refuse("allowed errors must be fewer than the trials: ", test.allowed, " of ", test.trials);
}

/// P(errors ≤ k | n, p) = I_{1−p}(n − k, k + 1), as the complement of I_p(k + 1, n − k).
double at_most(double k, double n, double p)
{
    return boost::math::ibetac(k + 1, n - k, p);
}

} // namespace

count_test plan_test(double target, double confidence, std::uint64_t allowed)
{
    require_inside("target", target);
    require_inside("confidence", confidence);
    const double beyond = 1 - confidence, k = static_cast<double>(allowed);
    const auto passes_rarely = [&](double n) { return at_most(k, n, target) <= beyond; };

    // The Poisson length brackets it: walk outward, then halve.
    double high = std::max(k + 1, std::ceil(boost::math::gamma_q_inv(k + 1, beyond) / target));
    while (!passes_rarely(high) && high <= most_trials)
        high = std::ceil(high * 1.5);
    if (high > most_trials)
        refuse("target ", target, " takes more than ", most_trials, " trials");
    double low = std::floor(high / 2);
    while (low > k && passes_rarely(low)) {
        high = low;
        low = std::floor(low / 2);
    }
    low = std::max(low, k); // n = k always passes
    while (high - low > 1) {
        const double middle = std::floor(low + (high - low) / 2);
        if (middle <= low || middle >= high) // beyond 2^53 not every integer is a double
            break;
        (passes_rarely(middle) ? high : low) = middle;
    }
    return {static_cast<std::uint64_t>(high), allowed};
}

double pass_probability(const count_test& test, double rate)
{
    require_test(test);
    if (!(rate >= 0 && rate <= 1))
        refuse("rate must lie in 0 … 1, got ", rate);
    return at_most(static_cast<double>(test.allowed), static_cast<double>(test.trials), rate);
}

double rate_at_pass_probability(const count_test& test, double chance)
{
    require_test(test);
    require_inside("chance", chance);
    return boost::math::ibetac_inv(
        static_cast<double>(test.allowed) + 1, static_cast<double>(test.trials - test.allowed), chance);
}

std::vector<plan_row> plan(const plan_request& request, const std::vector<std::uint64_t>& allowed)
{
    for (const auto& [name, value] : {std::pair{"trials_per_symbol", request.trials_per_symbol},
                                      std::pair{"dispersion", request.dispersion}})
        if (!(value > 0 && std::isfinite(value)))
            refuse(name, " must be a number above 0, got ", value);
    if (request.dispersion < 1)
        refuse("dispersion must be 1 or more, got ", request.dispersion);
    if (!(request.symbol_rate >= 0 && std::isfinite(request.symbol_rate)))
        refuse("symbol_rate must be a number of symbols a second, got ", request.symbol_rate);

    std::vector<plan_row> rows;
    for (std::uint64_t k : allowed) {
        // n clumps' worth of trials: rates of clumps a trial, as clumped_interval() counts them.
        const auto test = plan_test(request.target, request.confidence, k);
        const double symbols =
            std::ceil(static_cast<double>(test.trials) * request.dispersion / request.trials_per_symbol);
        rows.push_back({test,
                        symbols,
                        request.symbol_rate > 0 ? symbols / request.symbol_rate : 0,
                        rate_at_pass_probability(test, 0.5),
                        rate_at_pass_probability(test, request.confidence)});
    }
    return rows;
}

} // namespace halfplane
