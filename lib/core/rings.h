// SPDX-License-Identifier: GPL-3.0-or-later
// rings: points on circles, mirror images to the last bit.
#pragma once

#include "halfplane/signal_set.h"

#include <cstdint>

namespace halfplane::detail {

/*!
 * exp(2πi·numerator/denominator), reduced to the first octant in integers, so that points that mirror or turn
 * into each other by a quarter do so exactly. numerator, denominator < 2^32, denominator > 0.
 */
complex on_unit_circle(std::uint64_t numerator, std::uint64_t denominator);

} // namespace halfplane::detail
