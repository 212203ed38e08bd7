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

    /// Of the bits that change here, those that differ from `sent` on the side from which the wall is seen.
    label_t wrong_on_near_side(const edge_view& seen, label_t sent) const
    {
        return static_cast<label_t>(mask & ((seen.height >= 0 ? inner_bits : mask & ~inner_bits) ^ sent));
    }
};

/// Walls first … last − 1 lie within `radius` of `centre`.
struct wall_block {
    std::uint32_t first, last;
    complex centre;
    double radius;
};

struct wall_map {
    std::vector<wall> walls;
    std::vector<wall_block> blocks;
    /// By bit (0 the least significant): squared distance from a point to the nearest change of it next door.
    std::vector<double> approach;
};

/// The walls of labelled cells, near ones in blocks. Their geometry equals that of the edges to rounding.
wall_map build_walls(const cells& regions, const std::vector<label_t>& labels, unsigned label_bits);

} // namespace halfplane
