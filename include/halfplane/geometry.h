// SPDX-License-Identifier: GPL-3.0-or-later
// geometry: facts about a set for people: distances, facing points, symmetries, Gray or not; with a
// tolerance.
#pragma once

#include "halfplane/signal_set.h"

#include <cstddef>
#include <cstdint>
#include <string>
#include <vector>

namespace halfplane {

/*!
 * Typed coordinates carry few digits. All functions here take points as known to within tolerance · d_min
 * only: an 8-point ring rounded to four decimals still has eight rotations. Rates never use any of this; they
 * take the points as they stand.
 */
inline constexpr double default_tolerance = 1e-3;

/// A map z → c + exp(i·angle)·(z − c), or z → c + exp(i·angle)·conj(z − c) where mirrored, that carries every
/// point onto a point of the same prior.
struct symmetry {
    double angle_rad;                       ///< 0 ≤ angle < 2π
    bool mirrored;                          ///< conjugate first, then rotate
    complex centre;                         ///< c
    std::vector<std::uint16_t> permutation; ///< point i goes to point permutation[i]
};

/// How many maps of each kind there are. mirrors is 0 or equals rotations.
struct symmetry_count {
    std::size_t rotations, mirrors;
};

/*!
 * The symmetry group of a set about a centre, by default 0, about which a channel's gain and phase act. The
 * identity first, then rotations and then mirrors by ascending angle.
 * \param tolerance how far an image may lie from its point, in units of d_min, 0 ≤ tolerance < 0.25; priors
 *                  may differ by the same fraction
 * \throws std::invalid_argument for a tolerance outside this range or a centre that is not finite
 */
std::vector<symmetry>
symmetries(const signal_set& set, double tolerance = default_tolerance, complex centre = {});
symmetry_count
count_symmetries(const signal_set& set, double tolerance = default_tolerance, complex centre = {});

/*!
 * For each point the indices that it faces under equal priors, ascending. Two points are facing when there is
 * a place at the same distance from both that all other points are farther from by more than 2 · tolerance ·
 * d_min: then their cells share an edge whichever way the points move by tolerance · d_min. \param tolerance
 * 0 ≤ tolerance < 0.25; 0 asks for every edge of positive length
 */
std::vector<std::vector<std::size_t>> facing_points(const signal_set& set,
                                                    double tolerance = default_tolerance);

/// One distance of the profile and the ordered pairs that have it.
struct distance_count {
    double d;
    std::uint64_t pairs;
};

/*!
 * Distances between points, ascending; those within tolerance · d_min of the smallest of a group count as
 * one. \param most the profile ends after so many distances
 */
std::vector<distance_count>
distance_profile(const signal_set& set, double tolerance = default_tolerance, std::size_t most = 1000);

/// What `inspect` says of a set. Points, energies as signal_set gives them.
struct geometry_facts {
    std::string name;
    std::size_t size;
    unsigned label_bits;
    double entropy_bits, es, eb, mean_i, mean_q, papr_db, d_min;
    std::uint64_t closest_pairs;                  ///< ordered pairs at d_min
    double mean_closest;                          ///< Σ p_i · (closest neighbours of i)
    std::vector<std::vector<std::size_t>> facing; ///< facing_points()
    double mean_facing;                           ///< Σ p_i · (points that i faces)
    double facing_bit_distance;                   ///< mean label distance over facing pairs
    bool gray;                                    ///< all facing pairs differ in one bit
    bool gray_among_closest;                      ///< all closest pairs differ in one bit
    std::vector<distance_count> distances;        ///< distance_profile()
    std::size_t rotations, mirrors;               ///< about 0
};

/// \throws std::invalid_argument for a tolerance outside 0 … 0.25
geometry_facts
inspect(const signal_set& set, double tolerance = default_tolerance, std::size_t most_distances = 1000);

} // namespace halfplane
