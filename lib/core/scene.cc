// SPDX-License-Identifier: GPL-3.0-or-later
// scene: signed sums of wedges over edges (SER), walls (BER) and whole lines (the bounds).
#include "scene.h"

#include "halfplane/wedge.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane {

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

/// Squared distance from the mean to the nearest place of an edge.
double squared_approach(const edge_view& v)
{
    const double aside = std::max({0.0, v.from, -v.to});
    return v.height * v.height + aside * aside;
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
        const double w = (*this)({h, -inf, inf});
        return h >= 0 ? w : one() - w;
    }

    /// ln of tail at this squared distance over the scale.
    double relative_ln_tail(double squared_distance) const { return ln_tail(squared_distance) - d_ln_scale; }

private:
    double ln_tail(double squared_distance) const
    {
        const double u = 0.5 * squared_distance * d_noise.per_unit * d_noise.per_unit;
        return d_noise.fading ? d_noise.fading->ln_tail(u) : -u;
    }

    noise d_noise;
    double d_ln_scale;
};

/// The smallest distance at which anything goes wrong: sets the scale.
double least_squared_distance(const scene& s)
{
    double least = inf;
    for (const auto& a : s.arrivals) {
        if (a.owner != a.sent)
            return 0;
        for (auto k = s.regions->begin_of(a.sent); k != s.regions->end_of(a.sent); ++k)
            least = std::min(least, squared_approach(s.regions->edges()[*k].seen_from(a.mean)));
    }
    return std::isfinite(least) ? least : 0;
}

/// Sum over the edges of cell j of wedges, + where the mean lies on the inner side of the edge.
double mass_across(const scene& s, const scaled_wedge& w, std::size_t j, complex mean)
{
    double sum = 0;
    for (auto k = s.regions->begin_of(j); k != s.regions->end_of(j); ++k) {
        const auto& e = s.regions->edges()[*k];
        const auto v = e.seen_from(mean);
        sum += (v.height >= 0) == (e.inner == j) ? w(v) : -w(v);
    }
    return sum;
}

void exact_ser(const scene& s, const scaled_wedge& w, rate_sums& out)
{
    out.by_point.assign(s.set->size(), 0);
    std::vector<double> sent_weight(s.set->size(), 0);
    if (s.undisplaced && s.weights.empty() && !s.whiten) {
        // Both sides see an edge alike.
        for (const auto& e : s.regions->edges()) {
            const double p = w(e.seen_from(e.origin));
            out.by_point[e.inner] += p;
            out.by_point[e.outer] += p;
        }
        for (const auto& a : s.arrivals)
            out.exact.ser += a.weight * out.by_point[a.sent];
        return;
    }
    for (const auto& a : s.arrivals) {
        const double p = (a.owner == a.sent ? 0 : w.one()) + mass_across(s, w, a.sent, a.mean);
        out.by_point[a.sent] += a.weight * p;
        sent_weight[a.sent] += a.weight;
        out.exact.ser += a.weight * p;
    }
    for (std::size_t i = 0; i < s.set->size(); ++i)
        if (sent_weight[i] > 0)
            out.by_point[i] /= sent_weight[i];
}

void exact_ber(const scene& s, const scaled_wedge& w, rate_sums& out)
{
    const unsigned bits = s.set->label_bits();
    out.by_bit.assign(bits, 0);
    std::vector<double> one_arrival(bits);
    for (const auto& a : s.arrivals) {
        const label_t sent = s.set->labels()[a.sent];
        const label_t wrong_at_mean = sent ^ s.set->labels()[a.owner];
        for (unsigned k = 0; k < bits; ++k)
            one_arrival[k] = (wrong_at_mean >> k & 1) ? w.one() : 0;
        for (const auto& border : *s.walls) {
            const auto v = border.line.seen_from(a.mean);
            if (w.relative_ln_tail(squared_approach(v)) < -700)
                continue;
            const double p = w(v);
            // Bits that read right on the near side go wrong beyond the wall, the others come right.
            const label_t near = v.height >= 0 ? border.inner_bits : border.mask & ~border.inner_bits;
            const label_t wrong_near = border.mask & (near ^ sent);
            for (unsigned left = border.mask; left != 0; left &= left - 1) {
                const unsigned k = static_cast<unsigned>(__builtin_ctz(left));
                one_arrival[k] += (wrong_near >> k & 1) ? -p : p;
            }
        }
        for (unsigned k = 0; k < bits; ++k)
            out.by_bit[bits - 1 - k] += a.weight * one_arrival[k];
    }
    for (const double p : out.by_bit)
        out.exact.ber += p / bits;
}

/// Probability that i sent looks less likely than j, in scaled units.
double pairwise(const scene& s, const scaled_wedge& w, std::size_t i, std::size_t j)
{
    const complex apart = s.set->points()[j] - s.set->points()[i];
    const double d = std::abs(apart);
    double h = d / 2;
    if (!s.weights.empty())
        h += (s.weights[i] - s.weights[j]) / (2 * d);
    if (s.whiten) { // the line's distance after the map: divided by the length of the mapped normal
        const auto& a = *s.whiten;
        const complex n = apart / d;
        h *= std::abs(a[0] * a[3] - a[1] * a[2]) /
             std::hypot(a[3] * n.real() - a[2] * n.imag(), a[0] * n.imag() - a[1] * n.real());
    }
    return w.half_plane(h);
}

void add_pair(const scene& s, const scaled_wedge& w, std::size_t i, std::size_t j, ser_ber& sum)
{
    const auto& prior = s.set->priors();
    const double p = s.weights.empty() && !s.whiten
                         ? (prior[i] + prior[j]) * pairwise(s, w, i, j)
                         : prior[i] * pairwise(s, w, i, j) + prior[j] * pairwise(s, w, j, i);
    sum.ser += p;
    sum.ber += p * label_distance(s.set->labels()[i], s.set->labels()[j]) / s.set->label_bits();
}

void facing_sum(const scene& s, const scaled_wedge& w, ser_ber& sum)
{
    for (const auto& e : s.regions->edges())
        add_pair(s, w, e.inner, e.outer, sum);
    for (std::size_t i = 0; i < s.set->size(); ++i) {
        if (!s.regions->empty(i))
            continue;
        for (std::size_t j = 0; j < s.set->size(); ++j) {
            if (j == i)
                continue;
            const double p = s.set->priors()[i] * pairwise(s, w, i, j);
            sum.ser += p;
            sum.ber += p * label_distance(s.set->labels()[i], s.set->labels()[j]) / s.set->label_bits();
        }
    }
}

} // namespace

rate_sums evaluate(const scene& s, const noise& n, unsigned parts)
{
    const scaled_wedge w(n, least_squared_distance(s));
    rate_sums out;
    out.ln_scale = w.ln_scale();
    if (parts & part_exact_ser)
        exact_ser(s, w, out);
    if (parts & part_exact_ber)
        exact_ber(s, w, out);
    const std::size_t m = s.set->size();
    if (parts & part_facing)
        facing_sum(s, w, out.facing);
    if (parts & (part_union | part_nearest)) {
        const double closest = s.set->d_min() * (1 + 1e-9);
        for (std::size_t i = 0; i < m; ++i)
            for (std::size_t j = i + 1; j < m; ++j) {
                ser_ber pair;
                add_pair(s, w, i, j, pair);
                out.union_bound.ser += pair.ser;
                out.union_bound.ber += pair.ber;
                if (std::abs(s.set->points()[i] - s.set->points()[j]) <= closest) {
                    out.nearest.ser += pair.ser;
                    out.nearest.ber += pair.ber;
                }
            }
    }
    return out;
}

std::vector<double> transition_masses(const scene& s, const noise& n, const arrival& from)
{
    const scaled_wedge w(n, 0);
    std::vector<double> p(s.set->size(), 0);
    for (const auto& e : s.regions->edges()) {
        const auto v = e.seen_from(from.mean);
        const double mass = v.height >= 0 ? w(v) : -w(v);
        p[e.inner] -= mass;
        p[e.outer] += mass;
    }
    p[from.owner] += 1;
    for (double& x : p)
        x = std::max(x, 0.0);
    return p;
}

} // namespace halfplane
