// SPDX-License-Identifier: GPL-3.0-or-later
// contest: which points can win a decision somewhere in a rectangle.
#pragma once

#include "detect_view.h"

#include <cstdint>
#include <vector>

namespace halfplane::kernels {

struct box {
    double x0, x1, y0, y1;
};

/// The smallest rectangle around all points.
box hull_of(const std::vector<point_metric>& metrics);

/// Points by index, ascending.
using candidates = std::vector<std::uint16_t>;

/*!
 * A point is struck from the list of a rectangle when one other point beats it all over the rectangle by more
 * than double precision can blur. The metric is linear in the sample, so its least lead stands at a corner.
 */
class contest
{
public:
    explicit contest(const std::vector<point_metric>& metrics);

    candidates prune(const box& where, const candidates& in) const { return prune(where, in, nullptr); }
    /// The rectangle stands for the whole cone from `centre` through it.
    candidates prune_endless(const box& where, const candidates& in, double cx, double cy) const
    {
        const double centre[] = {cx, cy};
        return prune(where, in, centre);
    }
    /// What rounding can do to a difference of two metrics in `where`.
    double blur(const box& where) const;

private:
    candidates prune(const box& where, const candidates& in, const double* centre) const;

    const std::vector<point_metric>& d_metrics;
    double d_blur_slope, d_blur_constant;
};

} // namespace halfplane::kernels
