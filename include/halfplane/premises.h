// SPDX-License-Identifier: GPL-3.0-or-later
// premises: whether a link is what the predictions take it for.
#pragma once

#include "halfplane/residuals.h"

#include <optional>
#include <vector>

namespace halfplane {

enum class premise_state { holds, fails, too_few };
const char* to_string(premise_state s) noexcept;

/*!
 * One thing that the predictions take for granted: `p`, the chance of so much against it where it is true,
 * and `effect_db`, how far off it is. Both are needed: over 1e7 symbols everything real is significant.
 */
struct premise {
    const char* name;
    premise_state state;
    std::optional<double> p, effect_db; ///< absent with too few symbols
};

constexpr double premise_significance = 1e-4;         ///< fails below, if the effect is large enough
constexpr double premise_effect_db = 0.05;            ///< fails above, if it is significant
constexpr std::uint64_t least_premise_symbols = 4096; ///< explained ones; too few below

/*!
 * By name; N0 is what is left after the regression, P/N0 the part found over it, and the effect 10·log10(1 +
 * P/N0) where nothing else is said:
 *
 * - `no_memory`: neighbours k±1 … k±4 have no part in a symbol (echo, timing, filters); all eight together,
 *   Gamma(8, 1);
 * - `no_image`: nor has its conjugate (I/Q imbalance); exponential;
 * - `linear`: nor has s|s|² (compression); exponential;
 * - `circular`: radial and tangential noise are alike (phase noise, or where radial exceeds, amplitude
 * noise); normal, two-sided;
 * - `gaussian`: E|e|⁴ = 2(E|e|²)²; normal, two-sided; effect the ratio of the two in dB;
 * - `steady_noise`: the noise power of blocks of 64 symbols scatters no more than that of independent symbols
 *   (bursts); chi-squared with blocks − 1 degrees of freedom; effect 10·log10(1 + the squared coefficient of
 *   variation beyond that);
 * - `steady_gain`: nor does the gain of stretches of 512 symbols (fading, drifting phase); chi-squared with
 * two degrees of freedom a stretch;
 * - `white`: noise does not foretell the noise one symbol later; exponential; effect −10·log10(1 − |ρ|²).
 *
 * A column that the symbols sent cannot tell from the gain (s* on a line, s|s|² on a circle) gives no
 * premise. Nothing where nothing was gathered.
 */
std::vector<premise> find_premises(const residual_sums& sums);

} // namespace halfplane
