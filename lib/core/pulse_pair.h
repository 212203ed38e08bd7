// SPDX-License-Identifier: GPL-3.0-or-later
// pulse_pair: what a pair of pulses makes of neighbouring symbols, and which pair made what was seen.
#pragma once

#include "halfplane/residuals.h"

#include <array>
#include <optional>

namespace halfplane {

/// Raised cosine at t symbols, 1 at t = 0; roll-off in [0, 1].
double raised_cosine(double t, double roll_off);

/*!
 * Common response of two root raised cosines of unit energy: at lags 0 … reach symbols. At lag 0 it is the
 * correlation of the two, 1 where they are equal. To 1e-9.
 */
using pair_response = std::array<double, column::reach + 1>;
pair_response response_of(double roll_off, double other);

/// The response that comes nearest to these ratios of the taps at lags 1 … reach to that at 0; nothing where
/// the best leaves more than a tenth of their power.
std::optional<pair_response> find_pair(const std::array<double, column::reach>& taps);

} // namespace halfplane
