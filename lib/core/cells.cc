// SPDX-License-Identifier: GPL-3.0-or-later
// cells: power-diagram cells by cutting half-planes, nearest candidates first.
#include "halfplane/cells.h"

#include "cell_polygon.h"
#include "point_grid.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane {

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();
/// Cuts shallower than this, relative to the distance to the nearest point, are rounding.
constexpr double cut_tolerance = 1e-10;
/// Half width of the starting box in sizes of the set; what ends on the box is infinite.
constexpr double box_sizes = 1e6;

complex turned_left(complex z)
{
    return {-z.imag(), z.real()};
}

double dot(complex a, complex b)
{
    return a.real() * b.real() + a.imag() * b.imag();
}

struct candidate {
    double distance;
    std::uint16_t index;
};

/// Cuts one cell after the other out of the box, with scratch memory kept between them.
class cutter
{
public:
    cutter(const std::vector<complex>& points, const std::vector<double>& weights)
        : d_points(points), d_weights(weights), d_grid(points)
    {
        complex low = points[0], high = low;
        for (const auto& p : points) {
            low = {std::min(low.real(), p.real()), std::min(low.imag(), p.imag())};
            high = {std::max(high.real(), p.real()), std::max(high.imag(), p.imag())};
        }
        d_size = std::abs(high - low);
        d_scale = std::ldexp(1.0, -std::ilogb(d_size));
        if (!weights.empty()) {
            const auto range = std::minmax_element(weights.begin(), weights.end());
            d_heaviest = *range.second;
            d_weight_range = *range.second - *range.first;
        }
    }

    /// \returns false when the cell is empty
    bool make(std::size_t i)
    {
        const complex at = d_points[i];
        const double weight = d_weights.empty() ? 0 : d_weights[i];
        d_nearest = 0;
        bool started = false;
        double reach = 0;
        for (int ring = 0;; ++ring) {
            d_ring.clear();
            if (!d_grid.ring(at, ring, d_ring))
                return true;
            d_candidates.clear();
            for (const auto j : d_ring) {
                if (j == i)
                    continue;
                const double distance = distance_of(d_points[j] - at);
                if (started)
                    d_nearest = std::min(d_nearest, distance);
                if (!started || threshold_at(distance, weight, j) < reach)
                    d_candidates.push_back({distance, j});
            }
            std::sort(d_candidates.begin(), d_candidates.end(), [](const candidate& a, const candidate& b) {
                return a.distance < b.distance;
            });
            for (const auto& c : d_candidates) {
                if (!started) {
                    // The first candidate may not be the nearest point, but is within a bucket of it.
                    d_nearest = c.distance;
                    const double shift = d_weight_range / (2 * c.distance);
                    polygon.start(box_sizes * (d_size + shift));
                    reach = polygon.reach();
                    started = true;
                }
                d_nearest = std::min(d_nearest, c.distance);
                const double threshold = threshold_at(c.distance, weight, c.index);
                if (threshold >= reach)
                    continue;
                const cut_line line{(d_points[c.index] - at) / c.distance, threshold, c.index};
                const auto done = polygon.cut(line, cut_tolerance * d_nearest);
                if (done == cell_polygon::outcome::empty)
                    return false;
                if (done == cell_polygon::outcome::smaller)
                    reach = polygon.reach();
            }
            const double cleared = d_grid.cleared(ring);
            if (started && cleared > 0 && cleared / 2 - (d_heaviest - weight) / (2 * cleared) > reach)
                return true;
        }
    }

    double nearest() const { return d_nearest; }
    cell_polygon polygon;

private:
    /// |z|, for distances within the set: scaled by a power of two, squares neither overflow nor vanish.
    double distance_of(complex z) const { return std::sqrt(std::norm(z * d_scale)) / d_scale; }
    /// Distance of the border towards point j, measured from point i.
    double threshold_at(double distance, double weight, std::size_t j) const
    {
        return d_weights.empty() ? 0.5 * distance : 0.5 * distance + (weight - d_weights[j]) / (2 * distance);
    }

    const std::vector<complex>& d_points;
    const std::vector<double>& d_weights;
    point_grid d_grid;
    double d_size, d_scale, d_heaviest = 0, d_weight_range = 0, d_nearest = 0;
    std::vector<std::uint16_t> d_ring;
    std::vector<candidate> d_candidates;
};

complex middle(const cell_polygon& polygon)
{
    complex sum = 0;
    for (std::size_t k = 0; k < polygon.size(); ++k)
        sum += polygon.vertex(k);
    return sum / static_cast<double>(polygon.size());
}

} // namespace

edge edge::reversed() const noexcept
{
    return {outer, inner, origin, -normal, -offset, -to, -from};
}

cells::cells(const std::vector<complex>& points, const std::vector<double>& weights)
    : d_points(points), d_weights(weights)
{
    const std::size_t m = points.size();
    d_empty.assign(m, false);
    d_inside.assign(m, complex{});
    std::vector<std::vector<std::uint32_t>> of_cell(m);
    cutter work(points, weights);
    for (std::size_t i = 0; i < m; ++i) {
        if (!work.make(i)) {
            d_empty[i] = true;
            continue;
        }
        const auto& polygon = work.polygon;
        d_inside[i] = points[i] + middle(polygon);
        for (std::size_t k = 0; k < polygon.size(); ++k) {
            const auto& line = polygon.line(k);
            if (line.id < static_cast<int>(i)) // the box, or an edge that its other side has listed
                continue;
            const auto previous = polygon.line((k + polygon.size() - 1) % polygon.size()).id;
            const auto following = polygon.line((k + 1) % polygon.size()).id;
            const complex along = turned_left(line.normal);
            const double from = previous < 0 ? -inf : dot(along, polygon.vertex(k));
            const double to = following < 0 ? inf : dot(along, polygon.vertex(k + 1));
            if (to - from <= edge_tolerance * work.nearest())
                continue;
            const auto number = static_cast<std::uint32_t>(d_edges.size());
            d_edges.push_back({static_cast<std::uint16_t>(i),
                               static_cast<std::uint16_t>(line.id),
                               points[i],
                               line.normal,
                               line.offset,
                               from,
                               to});
            of_cell[i].push_back(number);
            of_cell[static_cast<std::size_t>(line.id)].push_back(number);
        }
    }
    d_first.assign(1, 0);
    for (const auto& list : of_cell) {
        d_of_cell.insert(d_of_cell.end(), list.begin(), list.end());
        d_first.push_back(static_cast<std::uint32_t>(d_of_cell.size()));
    }
}

std::vector<std::size_t> cells::facing(std::size_t i) const
{
    std::vector<std::size_t> out;
    if (d_empty[i]) {
        for (std::size_t j = 0; j < size(); ++j)
            if (j != i)
                out.push_back(j);
        return out;
    }
    for (auto k = begin_of(i); k != end_of(i); ++k)
        out.push_back(d_edges[*k].inner == i ? d_edges[*k].outer : d_edges[*k].inner);
    std::sort(out.begin(), out.end());
    return out;
}

std::size_t cells::owner(complex y) const noexcept
{
    std::size_t best = 0;
    double least = inf;
    for (std::size_t i = 0; i < d_points.size(); ++i) {
        const double power = std::norm(y - d_points[i]) - (d_weights.empty() ? 0 : d_weights[i]);
        if (power < least) {
            least = power;
            best = i;
        }
    }
    return best;
}

cells cells::mapped(const matrix2& a) const
{
    const auto apply = [&](complex z) {
        return complex{a[0] * z.real() + a[1] * z.imag(), a[2] * z.real() + a[3] * z.imag()};
    };
    const double det = a[0] * a[3] - a[1] * a[2];
    cells out = *this;
    for (auto& e : out.d_edges) {
        // Normals map by the inverse transpose; lengths along the line by that of the mapped tangent.
        const complex normal = complex{a[3] * e.normal.real() - a[2] * e.normal.imag(),
                                       -a[1] * e.normal.real() + a[0] * e.normal.imag()} /
                               det;
        const double stretch = std::abs(normal);
        const complex new_normal = normal / stretch;
        const complex tangent = apply(turned_left(e.normal));
        const complex new_tangent = turned_left(new_normal);
        const double foot = dot(new_tangent, apply(e.offset * e.normal));
        const double scale = dot(new_tangent, tangent);
        e.origin = apply(e.origin);
        e.normal = new_normal;
        e.offset /= stretch;
        e.from = foot + e.from * scale;
        e.to = foot + e.to * scale;
    }
    for (auto& p : out.d_inside)
        p = apply(p);
    return out;
}

} // namespace halfplane
