// SPDX-License-Identifier: GPL-3.0-or-later
// wedge: the probability beyond one straight edge, within the angle that the edge subtends at the mean.
#pragma once

#include "halfplane/law.h"

#include <cmath>

namespace halfplane {

/// Relative error of wedge() for Gaussian noise, over h and edges that give 0.5 down to 1e-300.
constexpr double wedge_accuracy = 1e-13;

/// A probability kept as integral·exp(−exponent), so that it may lie far below the smallest double.
struct wedge_value {
    double exponent = 0; ///< ≥ 0
    double integral = 0; ///< in [0, 1/2]

    double value() const noexcept { return integral * std::exp(-exponent); }
    double ln() const noexcept { return std::log(integral) - exponent; }
};

/*!
 * Circular Gaussian noise of standard deviation σ in each dimension, an edge at distance h·σ of the mean that
 * runs from x1·σ to x2·σ, measured along its line from the foot of the perpendicular:
 *
 *     W = (1/2π) ∫ exp(−r(θ)²/2) dθ = (1/2π) exp(−h²/2) ∫_{x1}^{x2} exp(−x²/2)·h/(h² + x²) dx
 *
 * (Craig, "A new, simple and exact result for calculating the probability of error for two-dimensional signal
 * constellations", IEEE MILCOM 1991, in Cartesian form.) An infinite edge gives Q(h).
 *
 * \param h      distance of the line in σ, ≥ 0. At h = 0 the limit h → 0+.
 * \param x1, x2 ends of the edge in σ, x1 ≤ x2, may be infinite
 * \returns the wedge to the relative error wedge_accuracy
 */
wedge_value wedge(double h, double x1, double x2) noexcept;

/// Relative error of wedge() under another law.
constexpr double law_wedge_accuracy = 1e-12;

/*!
 * The same with exp(−r²/2) replaced by the tail T(r²/2) of a law. Arguments as above; the exponent is
 * −ln T at the point of the edge that is closest to the mean.
 */
wedge_value wedge(const law& channel, double h, double x1, double x2);

} // namespace halfplane
