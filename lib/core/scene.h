// SPDX-License-Identifier: GPL-3.0-or-later
// scene: everything a rate depends on but the noise, and the sums of wedges over it.
#pragma once

#include "rate_sums.h"
#include "walls.h"

#include "halfplane/cells.h"
#include "halfplane/law.h"
#include "halfplane/signal_set.h"

#include <cstdint>
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

/// Borders, labels and arrivals in the plane in which the noise is circular.
struct scene {
    const signal_set* set;
    const cells* regions;
    const std::vector<wall>* walls;
    std::vector<arrival> arrivals;
    std::vector<double> weights;     ///< w_i of the power diagram, empty where all are equal
    const matrix2* whiten = nullptr; ///< from the set's plane to this one, null where they are the same
    bool undisplaced = true;         ///< one arrival a point, at the point itself
};

/// All asked figures of a scene.
rate_sums evaluate(const scene& where, const noise& what, unsigned parts);

/// P(j | arrival) for all j.
std::vector<double> transition_masses(const scene& where, const noise& what, const arrival& from);

} // namespace halfplane
