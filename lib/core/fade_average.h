// SPDX-License-Identifier: GPL-3.0-or-later
// fade_average: the mean of figures over a continuous fade whose decision cells move with it.
#pragma once

#include "rate_sums.h"

#include "halfplane/law.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

/*!
 * ∫ f(g)·figures(g) dg by the trapezoid rule in s = ln g, which converges geometrically where the figures are
 * smooth: it starts from steps of half a standard deviation of the gain and halves them until the figures
 * stand still. Edges that come and go with g leave derivatives that jump, hence a floor near 1e-9.
 * \param figures from gain to rate_sums
 */
template <typename Figures>
rate_sums average_over_fade(const law& channel, const Figures& figures)
{
    constexpr double settled = 1e-10, negligible = 1e-17;
    constexpr int most_halvings = 6;
    // Mean and variance from the cumulants of the gain, −(ln T)' and (ln T)'' at 0.
    constexpr double u = 1e-3;
    const double one = channel.ln_tail(u), two = channel.ln_tail(2 * u);
    const double mean = -(2 * one - 0.5 * two) / u, variance = std::max((two - 2 * one) / (u * u), 1e-10);
    double step = 0.5 * std::min(1.0, std::sqrt(variance) / mean);

    const auto term = [&](double s) {
        const double g = std::exp(s);
        rate_sums weighted;
        weighted.add(g * channel.density(g, 1), figures(g));
        return weighted;
    };
    const double centre = std::log(mean);
    rate_sums sum = term(centre);
    // Outward on both sides as far as any figure notices; the tails on both sides fall for good.
    const auto edge_of = [&](double stride) {
        int small = 0;
        double s = centre;
        while (small < 3 && std::abs(s) < 700) {
            s += stride;
            const auto t = term(s);
            small = t.negligible_beside(sum, negligible) ? small + 1 : 0;
            sum.add(1, t);
        }
        return s;
    };
    const double high = edge_of(step), low = edge_of(-step);
    for (int k = 0; k < most_halvings; ++k) {
        rate_sums between;
        for (double s = low + step / 2; s < high; s += step)
            between.add(1, term(s));
        step /= 2;
        // The rule has settled when the new places alone say what the old ones said.
        rate_sums difference = sum;
        difference.add(-1, between);
        sum.add(1, between);
        if (difference.absolute().negligible_beside(sum, settled))
            break;
    }
    rate_sums scaled;
    scaled.add(step, sum);
    return scaled;
}

} // namespace halfplane
