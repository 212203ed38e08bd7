// SPDX-License-Identifier: GPL-3.0-or-later
// impairment: a link with every cause of errors as a number, and its exact symbol error rate.
#pragma once

#include "halfplane/rates.h"
#include "halfplane/residuals.h"

#include <array>

namespace halfplane {

/// Taps of s_{k+lag}, at [column::neighbour(lag) − column::first_neighbour].
using neighbour_taps = std::array<complex, 2 * column::reach>;

/*!
 * r_k = gain·(e^{jφ_k + σ²/2}·s_k + offset + image·s*_k + Σ taps·s_{k+lag} + curve·s_k(|s_k|² − κ)) + noise,
 * points and noise divided by √Es; φ Gaussian of variance σ², independent of the rest, so that its factor has
 * mean 1 and `gain` is what least squares finds.
 */
struct impairment {
    complex gain = 1, offset = 0, image = 0, curve = 0;
    neighbour_taps taps{};
    double phase_variance = 0; ///< σ², rad²
    double n0 = 1;             ///< of the noise alone, over Es
    complex noise_square = 0;  ///< E[noise²]/n0: 0 where it is circular, below 1 in magnitude

    bool random() const; ///< the place of arrival differs from symbol to symbol
};

/// Arrivals evaluated for a random displacement, over all points.
constexpr std::size_t impairment_arrivals = 4096;

/*!
 * ln SER of the predictor's detector under the impairment, averaged over neighbours and phase. The average is
 * exact over one active tap with up to impairment_arrivals/M values; else a Latin hypercube sample from a
 * fixed seed, so that two impairments are compared on the same neighbours.
 */
double ln_ser(const predictor& p, const impairment& what);

} // namespace halfplane
