// SPDX-License-Identifier: GPL-3.0-or-later
// pair_classes: pairs of points grouped by distance, so that a bound over a grid needs few wedges.
#pragma once

#include "halfplane/signal_set.h"

#include <cstdint>
#include <optional>
#include <utility>
#include <vector>

namespace halfplane {

/// All pairs at one distance: Σ(p_i + p_j), and the same weighted by the share of bits that differ.
struct pair_class {
    double distance, ser_weight, ber_weight;
};

using index_pairs = std::vector<std::pair<std::uint16_t, std::uint16_t>>;

/// Groups of the listed pairs.
std::vector<pair_class> classes_of(const signal_set& set, const index_pairs& pairs);

/// Groups of all pairs; nothing where there are so many distances that grouping gains nothing.
std::optional<std::vector<pair_class>> classes_of_all(const signal_set& set);

/// Pairs at the smallest distance, to the rounding of coordinates (1e-9 relative).
index_pairs closest_pairs(const signal_set& set);

} // namespace halfplane
