// SPDX-License-Identifier: GPL-3.0-or-later
// interval: exact binomial and Poisson limits through the inverse incomplete beta and gamma functions.
#include "halfplane/interval.h"

#include "refusal.h"

#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace halfplane {

namespace {

void check(std::uint64_t errors, std::uint64_t trials, double confidence)
{
    if (trials == 0)
        detail::refuse<std::invalid_argument>("trials must be above 0, got 0");
    if (errors > trials)
        detail::refuse<std::invalid_argument>("errors must not exceed trials: ", errors, " of ", trials);
    if (!(confidence > 0 && confidence < 1))
        detail::refuse<std::invalid_argument>("confidence must lie between 0 and 1, got ", confidence);
}

} // namespace

interval binomial_interval(std::uint64_t errors, std::uint64_t trials, double confidence)
{
    check(errors, trials, confidence);
    const double k = static_cast<double>(errors), n = static_cast<double>(trials);
    const double beyond = 1 - confidence;
    if (errors == 0) // (1 − p)^n = beyond
        return {std::nullopt, -std::expm1(std::log(beyond) / n)};
    const double low = boost::math::ibeta_inv(k, static_cast<double>(trials - errors) + 1, beyond / 2);
    if (errors == trials)
        return {low, 1};
    return {low, boost::math::ibetac_inv(k + 1, static_cast<double>(trials - errors), beyond / 2)};
}

interval clumped_interval(std::uint64_t errors, std::uint64_t trials, double dispersion, double confidence)
{
    check(errors, trials, confidence);
    if (!std::isfinite(dispersion))
        detail::refuse<std::invalid_argument>("dispersion must be finite, got ", dispersion);
    const double clump = std::max(dispersion, 1.0);
    const double scale = clump / static_cast<double>(trials);
    const double beyond = 1 - confidence;
    if (errors == 0) // exp(−λ) = beyond
        return {std::nullopt, std::min(1.0, -std::log(beyond) * scale)};
    const double clumps = static_cast<double>(errors) / clump;
    return {boost::math::gamma_p_inv(clumps, beyond / 2) * scale,
            std::min(1.0, boost::math::gamma_q_inv(clumps + 1, beyond / 2) * scale)};
}

} // namespace halfplane
