// SPDX-License-Identifier: GPL-3.0-or-later
// scaled_wedge: wedges of one scene in units in which the largest is near 1, and a memory of those already
// known.
#pragma once

#include "scene.h"

#include "halfplane/wedge.h"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <cstring>
#include <limits>
#include <vector>

namespace halfplane {

/// Squared distance from the mean to the nearest place of an edge.
inline double squared_approach(const edge_view& v)
{
    const double aside = std::max({0.0, v.from, -v.to});
    return v.height * v.height + aside * aside;
}

/// The look that has the same wedge from either side and either end.
inline edge_view either_way(const edge_view& v)
{
    const double height = std::abs(v.height);
    return v.from + v.to < 0 ? edge_view{height, -v.to, -v.from} : edge_view{height, v.from, v.to};
}

/// Wedges divided by exp(ln_scale).
class scaled_wedge
{
public:
    scaled_wedge(const noise& n, double least_squared_distance)
        : d_noise(n), d_ln_scale(ln_tail(least_squared_distance))
    {
    }

    double ln_scale() const { return d_ln_scale; }
    /// The number that stands for probability 1.
    double one() const { return std::exp(-d_ln_scale); }

    double operator()(const edge_view& v) const
    {
        const double k = d_noise.per_unit;
        const double h = std::abs(v.height) * k;
        const auto w =
            d_noise.fading ? wedge(*d_noise.fading, h, v.from * k, v.to * k) : wedge(h, v.from * k, v.to * k);
        // Rounding alone separates equal exponents; where they are beyond 1e15 it must not overflow.
        return w.integral * std::exp(std::min(1.0, -w.exponent - d_ln_scale));
    }

    /// Probability beyond a whole line at signed distance h: more than half where h < 0.
    double half_plane(double h) const
    {
        const double w = (*this)({h, -infinite, infinite});
        return h >= 0 ? w : one() - w;
    }

    /// The distance at which the tail over the scale has fallen to exp(ln_ratio).
    double distance_at(double ln_ratio) const
    {
        const double wanted = -(ln_ratio + d_ln_scale);
        if (!d_noise.fading)
            return std::sqrt(2 * wanted) / d_noise.per_unit;
        double low = 0, high = 1;
        while (d_noise.fading->ln_tail(high) > -wanted && high < 1e300)
            high *= 4;
        while (high - low > 0.01 * high) {
            const double middle = 0.5 * (low + high);
            (d_noise.fading->ln_tail(middle) > -wanted ? low : high) = middle;
        }
        return std::sqrt(2 * high) / d_noise.per_unit;
    }

    /// ln of tail at this squared distance over the scale.
    double relative_ln_tail(double squared_distance) const { return ln_tail(squared_distance) - d_ln_scale; }

private:
    double ln_tail(double squared_distance) const
    {
        const double u = 0.5 * squared_distance * d_noise.per_unit * d_noise.per_unit;
        return d_noise.fading ? d_noise.fading->ln_tail(u) : -u;
    }

    static constexpr double infinite = std::numeric_limits<double>::infinity();
    noise d_noise;
    double d_ln_scale;
};

/// Wedges by their look: in a grid the same few come back over and over, to the last bit.
class wedge_memory
{
public:
    wedge_memory(const scaled_wedge& w, std::size_t edges) : d_wedge(w)
    {
        while (d_bits < 12 && (std::size_t{1} << d_bits) < 4 * edges)
            ++d_bits;
        d_known.assign(std::size_t{1} << d_bits, {{-1, 0, 0}, 0});
    }
    double operator()(const edge_view& seen)
    {
        const auto v = either_way(seen);
        auto& place = d_known[slot(v)];
        if (place.look.height != v.height || place.look.from != v.from || place.look.to != v.to)
            place = {v, d_wedge(v)};
        return place.mass;
    }

private:
    struct entry {
        edge_view look;
        double mass;
    };
    static std::uint64_t pattern(double x)
    {
        std::uint64_t bits;
        std::memcpy(&bits, &x, sizeof bits);
        return bits;
    }
    std::size_t slot(const edge_view& v) const
    {
        const auto mixed = (pattern(v.height) * 0x9E3779B97F4A7C15u ^ pattern(v.from)) * 0xBF58476D1CE4E5B9u;
        return (mixed ^ mixed >> 29) * 0x94D049BB133111EBu >> (64 - d_bits);
    }

    const scaled_wedge& d_wedge;
    unsigned d_bits = 6;
    std::vector<entry> d_known;
};

} // namespace halfplane
