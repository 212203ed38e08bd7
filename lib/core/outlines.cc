// SPDX-License-Identifier: GPL-3.0-or-later
// outlines: the frame, cut by the line of every edge of a cell.
#include "halfplane/outlines.h"

#include "halfplane/cells.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace halfplane {

namespace {

using polygon = std::vector<complex>;

/// Keeps what lies on the inner side of the edge's line (Sutherland and Hodgman, Comm. ACM 17 (1974) 32).
void cut(polygon& shape, const edge& e, polygon& kept)
{
    const auto beyond = [&](complex y) {
        const complex d = y - e.origin;
        return e.normal.real() * d.real() + e.normal.imag() * d.imag() - e.offset;
    };
    kept.clear();
    for (std::size_t k = 0; k < shape.size(); ++k) {
        const complex a = shape[k], b = shape[(k + 1) % shape.size()];
        const double out_a = beyond(a), out_b = beyond(b);
        if (out_a <= 0)
            kept.push_back(a);
        if ((out_a < 0 && out_b > 0) || (out_a > 0 && out_b < 0))
            kept.push_back(a + (b - a) * (out_a / (out_a - out_b)));
    }
    if (kept.size() < 3)
        kept.clear();
    shape.swap(kept);
}

/// Points of magnitude up to 1, as cells wants them, and the way back.
struct scaled_set {
    explicit scaled_set(const signal_set& set)
    {
        for (const auto& p : set.points())
            size = std::max(size, std::abs(p));
        for (const auto& p : set.points())
            points.push_back(p / size);
    }
    double size = 0;
    std::vector<complex> points;
};

void check(double n0, const frame& where)
{
    if (!(n0 >= 0) || !std::isfinite(n0))
        throw std::invalid_argument("n0 must be 0 or above, got " + std::to_string(n0));
    const bool sound = std::isfinite(where.left) && std::isfinite(where.right) &&
                       std::isfinite(where.bottom) && std::isfinite(where.top);
    if (!sound || !(where.left < where.right) || !(where.bottom < where.top))
        throw std::invalid_argument("a frame must have an area: left < right, bottom < top");
}

} // namespace

std::vector<std::vector<complex>> outlines(const signal_set& set, double n0, const frame& where)
{
    check(n0, where);
    const scaled_set scaled(set);
    std::vector<double> weights;
    if (n0 > 0 && !set.uniform())
        for (const double p : set.priors())
            weights.push_back(n0 / (scaled.size * scaled.size) * std::log(p));
    const cells regions(scaled.points, weights);

    const polygon whole = {complex(where.left, where.bottom) / scaled.size,
                           complex(where.right, where.bottom) / scaled.size,
                           complex(where.right, where.top) / scaled.size,
                           complex(where.left, where.top) / scaled.size};
    std::vector<polygon> all(set.size());
    polygon scratch;
    for (std::size_t i = 0; i < set.size(); ++i) {
        if (regions.empty(i))
            continue;
        polygon shape = whole;
        for (const auto* k = regions.begin_of(i); k != regions.end_of(i) && !shape.empty(); ++k) {
            const edge& e = regions.edges()[*k];
            cut(shape, e.inner == i ? e : e.reversed(), scratch);
        }
        for (auto& vertex : shape)
            vertex *= scaled.size;
        all[i] = std::move(shape);
    }
    return all;
}

} // namespace halfplane
