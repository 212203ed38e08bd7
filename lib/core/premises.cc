// SPDX-License-Identifier: GPL-3.0-or-later
// premises: eight tests on the sums over residuals.
#include "halfplane/premises.h"

#include "halfplane/rates.h"

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

double chance_above(double chi_squared, double degrees)
{
    return boost::math::cdf(
        boost::math::complement(boost::math::chi_squared(degrees), std::max(0.0, chi_squared)));
}

double two_sided(double z)
{
    return std::erfc(std::abs(z) / std::sqrt(2.0));
}

double effect_of(double ratio)
{
    return to_db(1 + std::max(0.0, ratio));
}

premise judged(const char* name, double p, double effect_db)
{
    const bool fails = p < premise_significance && effect_db > premise_effect_db;
    return {name, fails ? premise_state::fails : premise_state::holds, p, effect_db};
}

} // namespace

const char* to_string(premise_state s) noexcept
{
    switch (s) {
    case premise_state::holds:
        return "holds";
    case premise_state::fails:
        return "fails";
    case premise_state::too_few:
        return "too_few";
    }
    return "";
}

std::vector<premise> find_premises(const residual_sums& sums)
{
    if (sums.symbols() == 0)
        return {};
    const auto& m = sums.moments;
    const auto fit = fit_residuals(sums);
    if (m.symbols < least_premise_symbols || !fit) {
        std::vector<premise> all;
        for (const char* name : {"no_memory",
                                 "no_image",
                                 "linear",
                                 "circular",
                                 "gaussian",
                                 "steady_noise",
                                 "steady_gain",
                                 "white"})
            all.push_back({name, premise_state::too_few, std::nullopt, std::nullopt});
        return all;
    }
    const auto n = static_cast<double>(fit->symbols), counted = static_cast<double>(m.symbols);
    std::vector<premise> all;

    if (fit->neighbours > 0) {
        const auto places = static_cast<double>(fit->neighbours);
        all.push_back(judged("no_memory",
                             boost::math::gamma_q(places, std::max(0.0, fit->neighbour_strength)),
                             effect_of((fit->neighbour_strength - places) / n)));
    }
    for (const auto& [name, c] :
         {std::pair{"no_image", column::image}, std::pair{"linear", column::compression}})
        if (fit->known[c]) {
            const double x = fit->strength(c);
            all.push_back(judged(name, std::exp(-x), effect_of((x - 1) / n)));
        }

    // Moments, of noise of this power:
    const double n0 = m.power / counted, fourth = m.fourth / counted;
    const double z = m.turned.real() / std::sqrt(m.turned_norm / 2);
    all.push_back(
        judged("circular",
               two_sided(z),
               effect_of(std::abs(m.turned.real()) / m.signal_fourth *
                         std::norm(1.0 + fit->value[column::gain]) * fit->column_power[column::gain] / n0)));

    // For |e|² exponential, Var(m4 − 4·m2) = 4/n at N0 = 1.
    const double kurtosis = fourth / (n0 * n0);
    all.push_back(judged(
        "gaussian", two_sided((kurtosis - 2) * std::sqrt(counted) / 2), std::abs(to_db(kurtosis / 2))));

    const auto blocks = static_cast<double>(m.blocks), length = counted / blocks;
    const double block_mean = m.power / blocks;
    const double scatter = m.block_powers - blocks * block_mean * block_mean;
    const double of_one = fourth - n0 * n0; // variance of |e|²
    const double degrees = blocks - 1, chi = scatter / (length * of_one);
    all.push_back(judged("steady_noise",
                         chance_above(chi, degrees),
                         effect_of((chi / degrees - 1) * of_one / (length * n0 * n0))));

    const auto stretches = static_cast<double>(m.stretches);
    if (m.stretches > 0) {
        const double gains = m.radial_gain + m.tangential_gain;
        all.push_back(judged("steady_gain",
                             chance_above(gains, 2 * stretches),
                             effect_of((gains / (2 * stretches) - 1) * stretches / counted)));
    }

    const double share = 1 / static_cast<double>(m.pairs), x = std::norm(m.lag_one) / m.lag_one_norm;
    all.push_back(judged("white", std::exp(-x), -to_db(1 - std::clamp((x - 1) * share, 0.0, 0.999))));
    return all;
}

} // namespace halfplane
