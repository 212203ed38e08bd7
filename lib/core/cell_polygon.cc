// SPDX-License-Identifier: GPL-3.0-or-later
// cell_polygon: cutting a convex polygon by one half-plane after the other.
#include "cell_polygon.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

double dot(complex a, complex b)
{
    return a.real() * b.real() + a.imag() * b.imag();
}

double cross(complex a, complex b)
{
    return a.real() * b.imag() - a.imag() * b.real();
}

/// From the equations of both lines: interpolating between vertices would drag in the error of a far one.
complex crossing(const cut_line& a, const cut_line& b)
{
    const double d = cross(a.normal, b.normal);
    return {(a.offset * b.normal.imag() - b.offset * a.normal.imag()) / d,
            (b.offset * a.normal.real() - a.offset * b.normal.real()) / d};
}

} // namespace

void cell_polygon::start(double half_width)
{
    const double w = half_width;
    d_lines = {{{0, -1}, w, -1}, {{1, 0}, w, -1}, {{0, 1}, w, -1}, {{-1, 0}, w, -1}};
    d_vertices = {{-w, -w}, {w, -w}, {w, w}, {-w, w}};
}

cell_polygon::outcome cell_polygon::cut(const cut_line& line, double tolerance)
{
    const std::size_t n = d_vertices.size();
    d_depth.resize(n);
    double deepest = -INFINITY, shallowest = INFINITY;
    for (std::size_t k = 0; k < n; ++k) {
        d_depth[k] = dot(line.normal, d_vertices[k]) - line.offset;
        deepest = std::max(deepest, d_depth[k]);
        shallowest = std::min(shallowest, d_depth[k]);
    }
    if (deepest <= tolerance)
        return outcome::unchanged;
    if (shallowest >= 0) {
        d_lines.clear();
        d_vertices.clear();
        return outcome::empty;
    }
    d_next_lines.clear();
    d_next_vertices.clear();
    for (std::size_t k = 0; k < n; ++k) {
        const std::size_t next = k + 1 == n ? 0 : k + 1;
        const bool in = d_depth[k] < 0, next_in = d_depth[next] < 0;
        if (in) {
            d_next_vertices.push_back(d_vertices[k]);
            d_next_lines.push_back(d_lines[k]);
            if (!next_in) { // the polygon goes out here: the new line starts
                d_next_vertices.push_back(crossing(d_lines[k], line));
                d_next_lines.push_back(line);
            }
        } else if (next_in) { // and comes in here
            d_next_vertices.push_back(crossing(line, d_lines[k]));
            d_next_lines.push_back(d_lines[k]);
        }
    }
    d_lines.swap(d_next_lines);
    d_vertices.swap(d_next_vertices);
    return outcome::smaller;
}

double cell_polygon::reach() const
{
    double square = 0;
    for (const auto& v : d_vertices)
        square = std::max(square, std::norm(v));
    return std::sqrt(square);
}

} // namespace halfplane
