// SPDX-License-Identifier: GPL-3.0-or-later
// rings: exact reduction of an angle to its octant.
#include "rings.h"

#include <cmath>
#include <utility>

namespace halfplane::detail {

complex on_unit_circle(std::uint64_t numerator, std::uint64_t denominator)
{
    numerator %= denominator;
    const auto quarter = 4 * numerator / denominator;
    auto rest = 4 * numerator - quarter * denominator; // angle = (π/2)·(quarter + rest/denominator)
    const bool mirrored = 2 * rest > denominator;
    if (mirrored)
        rest = denominator - rest;
    const double angle = std::acos(0.0) * static_cast<double>(rest) / static_cast<double>(denominator);
    double x = std::cos(angle), y = std::sin(angle);
    if (2 * rest == denominator)
        x = y = std::sqrt(0.5);
    if (mirrored)
        std::swap(x, y);
    switch (quarter) {
    case 0:
        return {x, y};
    case 1:
        return {0 - y, x};
    case 2:
        return {0 - x, 0 - y};
    default:
        return {y, 0 - x};
    }
}

} // namespace halfplane::detail
