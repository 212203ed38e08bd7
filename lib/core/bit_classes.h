// SPDX-License-Identifier: GPL-3.0-or-later
// bit_classes: walls that look alike from many points, with what they do to each bit: on a grid the bit error
// rates of all points are a sum over few wedges.
#pragma once

#include "halfplane/cells.h"

#include <optional>
#include <vector>

namespace halfplane {

struct scene;
class scaled_wedge;

class bit_classes
{
public:
    /// Groups the walls by exactly equal look; nothing for unequal priors (whose sums would be rounded where
    /// they cancel) or where grouping gains little.
    static std::optional<bit_classes> of(const scene& s);

    /// Probability that each bit is wrong, leftmost first, in the units of `w`.
    std::vector<double> wrong_bits(const scaled_wedge& w) const;

private:
    struct entry {
        edge_view look;
        double approach; ///< squared distance to its nearest place
    };
    unsigned d_bits = 0;
    double d_weight = 0;          ///< prior of a point
    std::vector<entry> d_entries; ///< by ascending approach
    std::vector<double>
        d_counts; ///< entry after entry, bit after bit: points for which it makes wrong less right
    std::vector<double> d_beyond; ///< likewise: Σ|count| of this entry and all farther ones
};

} // namespace halfplane
