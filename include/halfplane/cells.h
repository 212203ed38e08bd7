// SPDX-License-Identifier: GPL-3.0-or-later
// cells: the decision regions of a set of points, as polygons with straight edges.
#pragma once

#include "halfplane/signal_set.h"

#include <array>
#include <cstdint>
#include <vector>

namespace halfplane {

/// Where a mean sees an edge: distance of the line, and both ends along it from the perpendicular's foot.
struct edge_view {
    double height; ///< signed: positive on the inner side
    double from, to;
};

/*!
 * A piece of the line n·(y − origin) = offset, n the unit normal from the inner to the outer point. Ends are
 * measured along the tangent (−n_q, n_i) and may be infinite.
 */
struct edge {
    std::uint16_t inner, outer; ///< indices of the points on both sides
    complex origin;             ///< the inner point
    complex normal;
    double offset;
    double from, to;

    edge_view seen_from(complex mean) const noexcept
    {
        const complex d = origin - mean;
        const double along = normal.real() * d.imag() - normal.imag() * d.real();
        return {offset + normal.real() * d.real() + normal.imag() * d.imag(), from + along, to + along};
    }
    /// The same edge with inner and outer side exchanged.
    edge reversed() const noexcept;
};

/// Real 2×2 matrix by rows, acting on (i, q).
using matrix2 = std::array<double, 4>;

/*!
 * Cell i of the power diagram: all y with |y − s_i|² − w_i ≤ |y − s_j|² − w_j for every j. Without weights
 * these are the nearest-point (Voronoi) cells; with w_i = N0·ln p_i the MAP decision regions of circular
 * Gaussian noise, where a cell may be empty and a point may lie outside its own cell (Aurenhammer, SIAM J.
 * Comput. 16 (1987) 78).
 *
 * Edges shorter than edge_tolerance times the distance to the nearest other point are taken as a common
 * corner.
 */
class cells
{
public:
    static constexpr double edge_tolerance = 1e-9;

    /// \param points  2 … 4096 distinct points of magnitude up to about 1 (scale first)
    /// \param weights as many, in the square of the points' unit, or empty
    explicit cells(const std::vector<complex>& points, const std::vector<double>& weights = {});

    std::size_t size() const noexcept { return d_first.size() - 1; }
    const std::vector<edge>& edges() const noexcept { return d_edges; }

    /// Numbers of the edges of cell i.
    const std::uint32_t* begin_of(std::size_t i) const noexcept { return d_of_cell.data() + d_first[i]; }
    const std::uint32_t* end_of(std::size_t i) const noexcept { return d_of_cell.data() + d_first[i + 1]; }

    bool empty(std::size_t i) const noexcept { return d_empty[i]; }
    /// Points whose cells share an edge with cell i, ascending. A point with an empty cell faces all others.
    std::vector<std::size_t> facing(std::size_t i) const;
    /// Some point well inside cell i, which must not be empty.
    complex inside(std::size_t i) const noexcept { return d_inside[i]; }
    /// Index of the cell that holds y; the lowest of several where y lies on their border. O(M).
    std::size_t owner(complex y) const noexcept;

    /// The same cells after y → A·y, for noise that is circular only then. owner() still takes y before the
    /// map.
    cells mapped(const matrix2& a) const;

private:
    std::vector<complex> d_points;
    std::vector<double> d_weights;
    std::vector<edge> d_edges;
    std::vector<std::uint32_t> d_of_cell, d_first;
    std::vector<bool> d_empty;
    std::vector<complex> d_inside;
};

} // namespace halfplane
