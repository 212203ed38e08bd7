// SPDX-License-Identifier: GPL-3.0-or-later
// facing_points: which cells share an edge that a small move of the points cannot close.
#include "halfplane/cells.h"
#include "halfplane/geometry.h"

#include "tolerance.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane {

namespace {

/*!
 * The line of equal distance ρ from two points, and the stretch of it that is left: places t, measured from
 * the middle, at which every point k shown so far has |x − s_k| ≥ ρ + margin.
 */
class stretch
{
public:
    stretch(complex a, complex b, double margin)
        : d_middle((a + b) / 2.0), d_half(std::abs(b - a) / 2),
          d_along(complex(-(b - a).imag(), (b - a).real()) / (2 * d_half)), d_margin(margin)
    {
    }

    bool closed() const { return d_from >= d_to; }

    /*!
     * Squared, |x − s_k| ≥ ρ + margin reads L(t) ≥ 2·margin·ρ(t) with L(t) = |x − s_k|² − ρ² − margin² = a +
     * b·t. ρ is convex in t, so one stretch remains.
     */
    void cut(complex point)
    {
        const complex w = point - d_middle;
        if (std::isfinite(d_farthest) && std::norm(w) > d_reach * d_reach)
            return;
        const double a = std::norm(w) - d_half * d_half - d_margin * d_margin;
        const double b = -2 * (w.real() * d_along.real() + w.imag() * d_along.imag());
        // L² − (2·margin·ρ)² = p·t² + 2q·t + r ≥ 0
        const double m2 = 4 * d_margin * d_margin;
        const double p = b * b - m2, q = a * b, r = a * a - m2 * d_half * d_half;
        const double discriminant = q * q - p * r;
        if (p > 0) { // L crosses 2·margin·ρ once and −2·margin·ρ once, behind
            const double root = std::sqrt(std::max(discriminant, 0.0));
            if (b > 0)
                d_from = std::max(d_from, (-q + root) / p);
            else
                d_to = std::min(d_to, (-q - root) / p);
        } else if (p == 0 || discriminant <= 0 || a <= 0) { // L stays below, or meets −2·margin·ρ only
            d_to = d_from;
        } else {
            const double root = std::sqrt(discriminant);
            d_from = std::max(d_from, (-q + root) / p);
            d_to = std::min(d_to, (-q - root) / p);
        }
        if (const double farthest = std::max(std::abs(d_from), std::abs(d_to)); farthest != d_farthest) {
            d_farthest = farthest;
            d_reach = farthest + std::hypot(d_half, farthest) + d_margin;
        }
    }

private:
    complex d_middle;
    double d_half;
    complex d_along;
    double d_margin;
    double d_from = -std::numeric_limits<double>::infinity(), d_to = -d_from;
    /// No place of the stretch, none being farther from the middle than d_farthest, is as near to a point
    /// beyond d_reach as to the two points.
    double d_farthest = d_to, d_reach = d_to;
};

bool faces(
    const std::vector<complex>& points, const cells& exact, std::size_t i, std::size_t j, double margin)
{
    stretch left(points[i], points[j], margin);
    const auto cut = [&](std::size_t k) {
        if (k != i && k != j)
            left.cut(points[k]);
        return !left.closed();
    };
    for (std::size_t centre : {i, j}) // those that cut most, so that the rest is out of reach
        for (std::size_t k : exact.facing(centre))
            if (!cut(k))
                return false;
    for (std::size_t k = 0; k < points.size(); ++k)
        if (!cut(k))
            return false;
    return true;
}

} // namespace

std::vector<std::vector<std::size_t>> facing_points(const signal_set& set, double tolerance)
{
    detail::require_tolerance(tolerance);
    double largest = 0;
    for (const auto& s : set.points())
        largest = std::max({largest, std::abs(s.real()), std::abs(s.imag())});
    std::vector<complex> scaled;
    for (const auto& s : set.points())
        scaled.push_back(s / largest);
    const cells exact(scaled);

    // A place with room around it lies on an edge of the exact cells, so those are all that need a look.
    std::vector<std::vector<std::size_t>> all(set.size());
    for (std::size_t i = 0; i < set.size(); ++i)
        for (std::size_t j : exact.facing(i))
            if (i < j &&
                (tolerance == 0 || faces(scaled, exact, i, j, 2 * tolerance * set.d_min() / largest))) {
                all[i].push_back(j);
                all[j].push_back(i);
            }
    for (auto& list : all)
        std::sort(list.begin(), list.end());
    return all;
}

} // namespace halfplane
