// SPDX-License-Identifier: GPL-3.0-or-later
// intersymbol: what the taps of neighbouring symbols come from: an echo, a timing error, filters that do not
// match.
#pragma once

#include "impairment.h"

#include <array>

namespace halfplane {

/// The taps split by cause; their sum is what was measured.
struct intersymbol_parts {
    neighbour_taps echo{}, timing{}, filter{};
    double timing_gain = 1; ///< gain of the symbol itself that the timing error costs, ≤ 1
    double filter_gain = 1; ///< the same of the filters
    double delay = 0;       ///< timing error in symbols
    double roll_off = 0;    ///< of the raised cosine that the timing error was told by
};

/*!
 * Tells causes apart by their shape, relative to the gain of the symbol itself:
 *
 * - a timing error τ at a matched receiver gives q(lag − τ)/q(τ), q the raised cosine of some roll-off:
 * nearly odd in the lag, decaying slowly, and it takes q(τ) of the gain;
 * - filters with phase of their own taken out give real taps even in the lag;
 * - an echo gives few taps without a counterpart on the other side, of any phase.
 *
 * Of all combinations the one with the least χ² + penalty for each number it needs is taken (the Bayesian
 * information criterion in form; the penalties stand beside the code). What no cause claims goes to the
 * strongest; without any, to the filters.
 *
 * Filters that do not match lose signal as well, mostly outside the band that the taps show. How much is read
 * off the pair of root raised cosines of unit energy whose common response gives these taps. Where no pair
 * does, Bessel's inequality bounds the gain: shifts of a Nyquist pulse by a symbol are orthogonal, so that it
 * is at most 1/√(1 + Σ|taps|²), and that is taken.
 *
 * \param variance of each tap's estimate; all taps are 0 in the answer where none is beyond chance
 */
intersymbol_parts split_taps(const neighbour_taps& taps,
                             const std::array<double, 2 * column::reach>& variance);

} // namespace halfplane
