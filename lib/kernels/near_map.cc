// SPDX-License-Identifier: GPL-3.0-or-later
#include "near_map.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane::kernels {

namespace {
constexpr unsigned page_side = 1u << near_view::page_bits;
constexpr double squares_a_spacing = 6; // a sample at SER 1e-2 then meets one candidate in nine cases of ten
constexpr unsigned most_pages_a_side = 512;
constexpr std::uint64_t most_pages = 1u << 13;
constexpr double finer = 1.25; // than the coarse grid, or it is not worth the second look

/// For each point the distance to the nearest other; points sorted by abscissa, so few are compared.
std::vector<double> spacings(const std::vector<point_metric>& metrics)
{
    std::vector<std::size_t> order(metrics.size());
    for (std::size_t i = 0; i < order.size(); ++i)
        order[i] = i;
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return metrics[a].re < metrics[b].re;
    });
    std::vector<double> nearest(metrics.size(), std::numeric_limits<double>::infinity());
    for (std::size_t a = 0; a < order.size(); ++a)
        for (std::size_t b = a + 1; b < order.size(); ++b) {
            const point_metric &p = metrics[order[a]], &q = metrics[order[b]];
            const double dx = q.re - p.re;
            if (dx > nearest[order[a]] && b > a + 1)
                break;
            const double distance = std::hypot(dx, q.im - p.im);
            nearest[order[a]] = std::min(nearest[order[a]], distance);
            nearest[order[b]] = std::min(nearest[order[b]], distance);
        }
    return nearest;
}
} // namespace

near_map::near_map(const std::vector<point_metric>& metrics, const contest& rules, double coarse_side)
    : d_metrics(metrics), d_rules(rules)
{
    std::vector<double> reach = spacings(metrics), sorted = reach;
    std::nth_element(sorted.begin(), sorted.begin() + static_cast<long>(sorted.size() / 2), sorted.end());
    const double spacing = sorted[sorted.size() / 2];
    const box hull = hull_of(metrics);
    const double wide = hull.x1 - hull.x0 + 2 * spacing, high = hull.y1 - hull.y0 + 2 * spacing;
    d_side =
        std::max(spacing / squares_a_spacing, std::max(wide, high) / (page_side * (most_pages_a_side - 3)));
    if (!(d_side * finer < coarse_side))
        return;
    // One page more on each side: clamping sends what is beyond, and NaN, there.
    d_wide = static_cast<unsigned>(wide / d_side / page_side) + 3;
    d_high = static_cast<unsigned>(high / d_side / page_side) + 3;
    // Half a square of shift puts the axes of symmetric sets inside a square instead of between two.
    const double shift = d_side / 2;
    d_view.x0 = static_cast<float>((hull.x0 + hull.x1) / 2 - d_side * page_side * d_wide / 2 + shift);
    d_view.y0 = static_cast<float>((hull.y0 + hull.y1) / 2 - d_side * page_side * d_high / 2 + shift);
    d_view.scale = static_cast<float>(1 / d_side);
    d_x0 = d_view.x0, d_y0 = d_view.y0, d_side = 1 / static_cast<double>(d_view.scale);
    const double squares = static_cast<double>(page_side) * std::max(d_wide, d_high);
    d_view.last_x = static_cast<float>(page_side * d_wide) - 0.5f;
    d_view.last_y = static_cast<float>(page_side * d_high) - 0.5f;
    d_view.wide = d_wide;
    // The rounding of (x − x0)·scale in float, two halves of 2^-23 of the number of squares, twice.
    d_overlap = std::ldexp(squares, -22);
    const double far = std::max({std::abs(d_x0), std::abs(d_y0), 1e-30}) + squares * d_side;
    if (!(far < 1e30) || !(d_side > 1e-30) || !(d_side > 16 * far * std::numeric_limits<float>::epsilon()))
        return;

    for (double& r : reach)
        r = std::max(r, spacing);
    for (double part = 1; !mark(reach); part *= 0.7) {
        if (part < 0.2)
            return;
        for (double& r : reach)
            r *= 0.7;
    }
    // Entry 0 stands for every page that is not kept.
    d_entries.push_back(near_view::elsewhere);
    d_pages.assign(std::size_t{d_wide} * d_high, 0);
    candidates all(metrics.size());
    for (std::size_t i = 0; i < all.size(); ++i)
        all[i] = static_cast<std::uint16_t>(i);
    fill_pages({1, d_wide - 2, 1, d_high - 2}, all);
    d_marks.clear(), d_known.clear();
    d_view.pages = d_pages.data(), d_view.entries = d_entries.data(), d_view.lists = d_lists.data();
}

/// Marks the pages within `reach` of each point; false where they are too many.
bool near_map::mark(const std::vector<double>& reach)
{
    const std::size_t row = d_wide + 1;
    d_marks.assign(row * (d_high + 1), 0);
    const double page = d_side * page_side;
    const auto place = [](double t, unsigned most) {
        return static_cast<std::size_t>(std::clamp(t, 0.0, static_cast<double>(most - 1)));
    };
    for (std::size_t i = 0; i < d_metrics.size(); ++i) {
        const double x = d_metrics[i].re - d_x0, y = d_metrics[i].im - d_y0, r = reach[i];
        for (std::size_t v = place((y - r) / page, d_high); v <= place((y + r) / page, d_high); ++v)
            for (std::size_t u = place((x - r) / page, d_wide); u <= place((x + r) / page, d_wide); ++u) {
                const double left = static_cast<double>(u) * page, low = static_cast<double>(v) * page;
                const double dx = x - std::clamp(x, left, left + page),
                             dy = y - std::clamp(y, low, low + page);
                if (dx * dx + dy * dy <= r * r)
                    d_marks[(v + 1) * row + u + 1] = 1;
            }
    }
    for (std::size_t v = 1; v <= d_high; ++v)
        for (std::size_t u = 1; u <= d_wide; ++u)
            d_marks[v * row + u] +=
                d_marks[(v - 1) * row + u] + d_marks[v * row + u - 1] - d_marks[(v - 1) * row + u - 1];
    return d_marks.back() <= most_pages;
}

std::uint64_t near_map::marked(const block& pages) const
{
    const std::size_t row = d_wide + 1;
    const auto below = [&](std::size_t u, std::size_t v) { return d_marks[v * row + u]; };
    const std::size_t u = pages.ix + pages.nx, v = pages.iy + pages.ny;
    return below(u, v) - below(pages.ix, v) - below(u, pages.iy) + below(pages.ix, pages.iy);
}

void near_map::fill_pages(const block& pages, const candidates& in)
{
    if (marked(pages) == 0)
        return;
    const block squares{
        pages.ix * page_side, pages.nx * page_side, pages.iy * page_side, pages.ny * page_side};
    const candidates list = d_rules.prune(around(squares), in);
    const auto first = static_cast<std::uint32_t>(d_entries.size());
    if (list.size() == 1) {
        d_entries.push_back(list[0]);
        for (unsigned y = pages.iy; y < pages.iy + pages.ny; ++y)
            std::fill_n(d_pages.begin() + pages.ix + std::size_t{y} * d_wide, pages.nx, first << 1);
    } else if (pages.nx == 1 && pages.ny == 1) {
        d_entries.resize(d_entries.size() + page_side * page_side, near_view::elsewhere);
        d_pages[pages.ix + std::size_t{pages.iy} * d_wide] = first << 1 | 1;
        fill_page(first, squares, squares, list);
    } else if (pages.nx >= pages.ny) {
        fill_pages({pages.ix, pages.nx / 2, pages.iy, pages.ny}, list);
        fill_pages({pages.ix + pages.nx / 2, pages.nx - pages.nx / 2, pages.iy, pages.ny}, list);
    } else {
        fill_pages({pages.ix, pages.nx, pages.iy, pages.ny / 2}, list);
        fill_pages({pages.ix, pages.nx, pages.iy + pages.ny / 2, pages.ny - pages.ny / 2}, list);
    }
}

void near_map::fill_page(std::uint32_t first, const block& squares, const block& page, const candidates& in)
{
    const candidates list = d_rules.prune(around(squares), in);
    if (list.size() == 1 || (squares.nx == 1 && squares.ny == 1)) {
        const std::uint16_t entry = entry_of(list);
        for (unsigned y = squares.iy - page.iy; y < squares.iy - page.iy + squares.ny; ++y)
            std::fill_n(
                d_entries.begin() + first + (squares.ix - page.ix) + y * page_side, squares.nx, entry);
        return;
    }
    const unsigned half = std::max(squares.nx, squares.ny) / 2;
    if (squares.nx >= squares.ny) {
        fill_page(first, {squares.ix, half, squares.iy, squares.ny}, page, list);
        fill_page(first, {squares.ix + half, squares.nx - half, squares.iy, squares.ny}, page, list);
    } else {
        fill_page(first, {squares.ix, squares.nx, squares.iy, half}, page, list);
        fill_page(first, {squares.ix, squares.nx, squares.iy + half, squares.ny - half}, page, list);
    }
}

box near_map::around(const block& s) const
{
    return {d_x0 + (s.ix - d_overlap) * d_side,
            d_x0 + (s.ix + s.nx + d_overlap) * d_side,
            d_y0 + (s.iy - d_overlap) * d_side,
            d_y0 + (s.iy + s.ny + d_overlap) * d_side};
}

/// Long lists, and more lists than there are numbers for, are left to the candidate map.
std::uint16_t near_map::entry_of(const candidates& list)
{
    if (list.size() == 1)
        return list[0];
    if (list.size() > few_candidates::size)
        return near_view::elsewhere;
    const auto known = d_known.find(list);
    if (known != d_known.end())
        return known->second;
    if (d_lists.size() >= near_view::elsewhere - near_view::open)
        return near_view::elsewhere;
    const auto entry = static_cast<std::uint16_t>(near_view::open + d_lists.size());
    few_candidates few{};
    for (std::size_t k = 0; k < few_candidates::size; ++k)
        few.index[k] = list[std::min(k, list.size() - 1)];
    d_lists.push_back(few);
    d_known.emplace(list, entry);
    return entry;
}

} // namespace halfplane::kernels
