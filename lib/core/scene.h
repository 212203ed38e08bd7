// SPDX-License-Identifier: GPL-3.0-or-later
// scene: everything a rate depends on but the noise, and the sums of wedges over it.
#pragma once

#include "bit_classes.h"
#include "pair_classes.h"
#include "rate_sums.h"
#include "walls.h"

#include "halfplane/cells.h"
#include "halfplane/law.h"
#include "halfplane/signal_set.h"

#include <cstdint>
#include <memory>
#include <mutex>
#include <optional>
#include <vector>

namespace halfplane {

/// A point sent, where it arrives on average, how often, and in whose cell that lies.
struct arrival {
    std::size_t sent;
    complex mean;
    double weight;
    std::size_t owner;
};

/// Noise of a scene: deviation 1/per_unit in each dimension, under a law (none: AWGN).
struct noise {
    double per_unit;
    const law* fading = nullptr;
};

/// Edges that look alike from their points: Σ(p_i + p_j) over them.
struct edge_class {
    edge_view look;
    double weight = 0;
};

/// What repeats itself in cells that stay, under nearest-point decisions and circular noise.
struct repetitions {
    std::vector<edge_class> edge_classes;
    std::vector<std::uint32_t> class_of_edge;
    std::vector<pair_class> facing, nearest;
    /// Of all pairs; gathered on first use.
    const std::optional<std::vector<pair_class>>& all(const signal_set& set) const;
    /// Of all walls as seen from all points; gathered on first use.
    const std::optional<bit_classes>& bits(const scene& undisplaced) const;

private:
    mutable std::once_flag d_once, d_bits_once;
    mutable std::optional<std::vector<pair_class>> d_all;
    mutable std::optional<bit_classes> d_bits;
};

/// Groups the edges and pairs of a set. \returns never null
std::unique_ptr<repetitions> find_repetitions(const signal_set& set, const cells& regions);

/// Borders, labels and arrivals in the plane in which the noise is circular.
struct scene {
    const signal_set* set;
    const cells* regions;
    const wall_map* walls;
    std::vector<arrival> arrivals;
    std::vector<double> weights;           ///< w_i of the power diagram, empty where all are equal
    const matrix2* whiten = nullptr;       ///< from the set's plane to this one, null where they are the same
    const repetitions* repeated = nullptr; ///< null where edges look different from their two sides
    bool undisplaced = true;               ///< one arrival a point, at the point itself
};

/// All asked figures of a scene.
rate_sums evaluate(const scene& where, const noise& what, unsigned parts);

/// P(j | arrival) for all j, one row for each arrival.
std::vector<double>
transition_masses(const scene& where, const noise& what, const std::vector<arrival>& from);

} // namespace halfplane
