// SPDX-License-Identifier: GPL-3.0-or-later
// cell_polygon: a convex polygon that half-planes cut down, each vertex kept as the crossing of two lines.
#pragma once

#include "halfplane/signal_set.h"

#include <vector>

namespace halfplane {

/// The line n·y = offset, n a unit vector out of the polygon; `id` ≥ 0 names who cut, below 0 the box.
struct cut_line {
    complex normal;
    double offset;
    int id;
};

class cell_polygon
{
public:
    /// Starts from the square |i|, |q| ≤ half_width.
    void start(double half_width);

    enum class outcome { unchanged, smaller, empty };
    /// Cuts away n·y > offset, unless nothing reaches farther than `tolerance` beyond the line.
    outcome cut(const cut_line& line, double tolerance);

    /// Distance of the farthest vertex from the origin.
    double reach() const;

    /// Line k runs counter-clockwise from vertex(k) to vertex(k + 1).
    std::size_t size() const { return d_lines.size(); }
    const cut_line& line(std::size_t k) const { return d_lines[k]; }
    complex vertex(std::size_t k) const { return d_vertices[k % d_vertices.size()]; }

private:
    std::vector<cut_line> d_lines, d_next_lines;
    std::vector<complex> d_vertices, d_next_vertices;
    std::vector<double> d_depth;
};

} // namespace halfplane
