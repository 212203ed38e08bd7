// SPDX-License-Identifier: GPL-3.0-or-later
// outlines: decision cells as closed polygons, cut off at a frame, to draw them.
#pragma once

#include "halfplane/signal_set.h"

#include <vector>

namespace halfplane {

/// An upright rectangle in the unit of a set's points.
struct frame {
    double left, right, bottom, top;
};

/*!
 * The decision cell of every point as far as it lies within the frame: vertices counter-clockwise, by index;
 * empty where the cell has no part in the frame, or under MAP no part at all. The same cells as the exact
 * rates are integrated over (cells.h).
 *
 * \param n0    two-sided complex noise variance in the square of the points' unit: MAP decisions under the
 *              set's priors in circular Gaussian noise. 0: the nearest point decides
 * \param where must have an area
 * \returns vertices good to about 1e-9 of the set's size
 * \throws std::invalid_argument for an n0 that is negative or not finite, or a frame without an area
 */
std::vector<std::vector<complex>> outlines(const signal_set& set, double n0, const frame& where);

} // namespace halfplane
