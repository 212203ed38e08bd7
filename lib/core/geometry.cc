// SPDX-License-Identifier: GPL-3.0-or-later
// geometry: distances between points and what `inspect` says of a set.
#include "halfplane/geometry.h"

#include "tolerance.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

/// Distances of all pairs, i < j, ascending.
std::vector<double> pair_distances(const signal_set& set)
{
    // In units of d_min no square overflows or vanishes before two points are one.
    const auto& s = set.points();
    std::vector<double> all;
    all.reserve(s.size() * (s.size() - 1) / 2);
    for (std::size_t i = 0; i < s.size(); ++i)
        for (std::size_t j = i + 1; j < s.size(); ++j)
            all.push_back(std::sqrt(std::norm((s[i] - s[j]) / set.d_min())) * set.d_min());
    std::sort(all.begin(), all.end());
    return all;
}

struct closest_facts {
    std::uint64_t pairs = 0; ///< ordered
    double mean = 0;
    bool gray = true;
};

closest_facts closest(const signal_set& set, double tolerance)
{
    const double limit = set.d_min() * (1 + tolerance + 1e-12);
    const auto& s = set.points();
    std::vector<std::size_t> order(s.size());
    for (std::size_t k = 0; k < order.size(); ++k)
        order[k] = k;
    std::sort(order.begin(), order.end(), [&](auto a, auto b) { return s[a].real() < s[b].real(); });

    closest_facts facts;
    for (std::size_t a = 0; a < order.size(); ++a)
        for (std::size_t b = a + 1; b < order.size(); ++b) {
            const std::size_t i = order[a], j = order[b];
            if (s[j].real() - s[i].real() > limit)
                break;
            if (std::hypot(s[i].real() - s[j].real(), s[i].imag() - s[j].imag()) > limit)
                continue;
            facts.pairs += 2;
            facts.mean += set.priors()[i] + set.priors()[j];
            facts.gray = facts.gray && label_distance(set.labels()[i], set.labels()[j]) == 1;
        }
    return facts;
}

} // namespace

std::vector<distance_count> distance_profile(const signal_set& set, double tolerance, std::size_t most)
{
    detail::require_tolerance(tolerance);
    std::vector<distance_count> profile;
    const double width = set.d_min() * (tolerance + 1e-12);
    for (double d : pair_distances(set)) {
        if (profile.empty() || d > profile.back().d + width + 1e-12 * d) {
            if (profile.size() == most)
                break;
            profile.push_back({d, 0});
        }
        profile.back().pairs += 2;
    }
    return profile;
}

geometry_facts inspect(const signal_set& set, double tolerance, std::size_t most_distances)
{
    detail::require_tolerance(tolerance);
    const auto near = closest(set, tolerance);
    auto facing = facing_points(set, tolerance);
    double mean_facing = 0, bits = 0;
    std::uint64_t pairs = 0;
    bool gray = true;
    for (std::size_t i = 0; i < set.size(); ++i) {
        mean_facing += set.priors()[i] * static_cast<double>(facing[i].size());
        for (std::size_t j : facing[i]) {
            const unsigned distance = label_distance(set.labels()[i], set.labels()[j]);
            bits += distance;
            gray = gray && distance == 1;
            ++pairs;
        }
    }
    const auto maps = count_symmetries(set, tolerance);
    return {set.name(),
            set.size(),
            set.label_bits(),
            set.entropy_bits(),
            set.es(),
            set.eb(),
            set.mean().real(),
            set.mean().imag(),
            set.papr_db(),
            set.d_min(),
            near.pairs,
            near.mean,
            std::move(facing),
            mean_facing,
            pairs ? bits / static_cast<double>(pairs) : 0,
            gray,
            near.gray,
            distance_profile(set, tolerance, most_distances),
            maps.rotations,
            maps.mirrors};
}

} // namespace halfplane
