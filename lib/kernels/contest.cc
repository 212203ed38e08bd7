// SPDX-License-Identifier: GPL-3.0-or-later
#include "contest.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane::kernels {

box hull_of(const std::vector<point_metric>& metrics)
{
    const double infinity = std::numeric_limits<double>::infinity();
    box hull{infinity, -infinity, infinity, -infinity};
    for (const point_metric& m : metrics) {
        hull.x0 = std::min(hull.x0, m.re), hull.x1 = std::max(hull.x1, m.re);
        hull.y0 = std::min(hull.y0, m.im), hull.y1 = std::max(hull.y1, m.im);
    }
    return hull;
}

contest::contest(const std::vector<point_metric>& metrics) : d_metrics(metrics)
{
    double size = 0, constant = 0;
    for (const point_metric& m : metrics) {
        size = std::max({size, std::abs(m.re), std::abs(m.im)});
        constant = std::max(constant, std::abs(m.constant));
    }
    // Each metric carries at most three roundings; two metrics, and as much again for the test itself, with
    // room.
    constexpr double roundings = 32 * std::numeric_limits<double>::epsilon();
    d_blur_slope = roundings * size;
    d_blur_constant = roundings * constant;
}

double contest::blur(const box& where) const
{
    const double x = std::max(std::abs(where.x0), std::abs(where.x1));
    const double y = std::max(std::abs(where.y0), std::abs(where.y1));
    return d_blur_slope * (x + y) + d_blur_constant;
}

candidates contest::prune(const box& where, const candidates& in, const double* centre) const
{
    const double mx = (where.x0 + where.x1) / 2, hx = (where.x1 - where.x0) / 2;
    const double my = (where.y0 + where.y1) / 2, hy = (where.y1 - where.y0) / 2;
    const double blurred = blur(where);

    const auto winner = [&](double x, double y, const candidates& among) {
        std::uint16_t best = among[0];
        double top = -std::numeric_limits<double>::infinity();
        for (const std::uint16_t i : among) {
            const point_metric& m = d_metrics[i];
            const double value = x * m.re + y * m.im + m.constant;
            if (value > top)
                top = value, best = i;
        }
        return best;
    };
    candidates left = in, kept;
    const auto strike = [&](std::uint16_t by) {
        const point_metric& w = d_metrics[by];
        kept.clear();
        for (const std::uint16_t j : left) {
            const point_metric& m = d_metrics[j];
            const double dx = w.re - m.re, dy = w.im - m.im;
            const double lead =
                dx * mx + dy * my + (w.constant - m.constant) - std::abs(dx) * hx - std::abs(dy) * hy;
            bool beaten = lead > blurred;
            if (beaten && centre) // and the lead must not shrink on the way outwards
                beaten =
                    dx * (mx - centre[0]) + dy * (my - centre[1]) - std::abs(dx) * hx - std::abs(dy) * hy >=
                    blurred;
            if (j == by || !beaten)
                kept.push_back(j);
        }
        left.swap(kept);
    };
    strike(winner(mx, my, left));
    for (const double sx : {-1.0, 1.0})
        for (const double sy : {-1.0, 1.0})
            if (left.size() > 1)
                strike(winner(mx + sx * hx, my + sy * hy, left));
    return left;
}

} // namespace halfplane::kernels
