// SPDX-License-Identifier: GPL-3.0-or-later
// walls: the borders at which decided bits change, collinear edges with the same change made one.
#pragma once

#include "halfplane/cells.h"

#include <vector>

namespace halfplane {

/*!
 * Crossing a wall from the inner to the outer side flips the bits `mask`; on the inner side they read
 * `inner_bits`. In a Gray-labelled square set all edges along one grid line flip the same bit and become one
 * infinite wall, so the exact BER of M points costs M·√M wedges.
 */
struct wall {
    edge line;
    label_t mask, inner_bits;
};

/// The walls of labelled cells. Their geometry equals that of the edges to rounding.
std::vector<wall> build_walls(const cells& regions, const std::vector<label_t>& labels);

} // namespace halfplane
