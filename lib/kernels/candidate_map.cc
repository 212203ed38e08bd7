// SPDX-License-Identifier: GPL-3.0-or-later
#include "candidate_map.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <queue>

namespace halfplane::kernels {

namespace {
// Squares are widened by this part of their side before points are struck, on every side. It covers the
// rounding of (x − x0)·sx in float: at most width·2^-23 ≤ 2.5e-4 for the widest main grid.
constexpr double overlap = 1e-3;
constexpr std::size_t squares_a_point = 256;
constexpr std::size_t squares_behind_near = 1u << 14;
constexpr unsigned widest = 2048;
constexpr unsigned child_squares = 8;
constexpr std::size_t long_list = 6; // beyond, a child frame is wanted
constexpr std::size_t child_frames =
    256; // at most; where many points tie along a line, refining it never ends
constexpr unsigned shell_count = 20;
constexpr double largest_magnitude = 1e100;
} // namespace

/// What is needed while building only.
struct candidate_map::workshop {
    struct crowded {
        double weight;
        std::size_t square;
        box where;
        candidates list;
        bool operator<(const crowded& other) const { return weight < other.weight; }
    };
    std::map<candidates, std::uint16_t> known_lists;
    std::priority_queue<crowded> crowds;
    double weight = 1; // of the frame being filled: the chance that a sample falls there, roughly
};

namespace {
std::vector<point_metric> metrics_of(const signal_set& set, const std::vector<double>& bias)
{
    std::vector<point_metric> metrics;
    for (std::size_t i = 0; i < set.size(); ++i) {
        const complex s = set.points()[i];
        metrics.push_back({s.real(), s.imag(), -std::norm(s) / 2 + (bias.empty() ? 0.0 : bias[i])});
    }
    return metrics;
}
} // namespace

candidate_map::candidate_map(const signal_set& set, const std::vector<double>& bias)
    : d_metrics(metrics_of(set, bias)), d_rules(d_metrics)
{
    double size = 0, constant = 0;
    for (const point_metric& m : d_metrics) {
        size = std::max({size, std::abs(m.re), std::abs(m.im)});
        constant = std::max(constant, std::abs(m.constant));
    }
    d_view.size = set.size();
    d_view.scan_all = !(size < largest_magnitude && size > 1 / largest_magnitude && constant < 1e200);
    if (!d_view.scan_all) {
        std::size_t wanted = std::clamp<std::size_t>(squares_a_point * set.size(), 1024, 1u << 17);
        d_near = std::make_unique<near_map>(d_metrics, d_rules, main_side(wanted));
        d_view.near = d_near->view();
        if (d_view.near.pages) // few samples are left to the main grid
            wanted = squares_behind_near;
        for (std::size_t squares = wanted;; squares /= 4) {
            workshop tools;
            d_tools = &tools;
            d_frames.clear(), d_entries.clear(), d_links.clear(), d_lists.clear();
            d_overflow = false;
            lay_main_grid(squares);
            lay_shells();
            lay_children();
            if (!d_overflow)
                break;
            if (squares < 64) {
                d_view.scan_all = true;
                break;
            }
        }
        d_tools = nullptr;
    }
    d_view.metrics = d_metrics.data();
    d_view.entries = d_entries.data();
    d_view.links = d_links.data();
    d_view.lists = d_lists.data();
    d_view.frames = d_frames.data();
}

detect_view candidate_map::view() const noexcept
{
    return d_view;
}

std::size_t candidate_map::add_frame(const square_frame& f)
{
    d_frames.push_back(f);
    d_frames.back().first = static_cast<std::uint32_t>(d_entries.size());
    d_entries.resize(d_entries.size() + std::size_t{f.width} * f.height, detect_view::outside);
    return d_frames.size() - 1;
}

double candidate_map::main_margin(const box& hull) const
{
    const double wide = hull.x1 - hull.x0, high = hull.y1 - hull.y0;
    const double count = static_cast<double>(d_metrics.size());
    return 1.5 * std::max(std::sqrt(wide * high / count), std::max(wide, high) / count);
}

double candidate_map::main_side(std::size_t squares_wanted) const
{
    const box hull = hull_of(d_metrics);
    const double beside = 2 * main_margin(hull);
    const double wide = hull.x1 - hull.x0 + beside, high = hull.y1 - hull.y0 + beside;
    return std::max(std::sqrt(wide * high / static_cast<double>(squares_wanted)),
                    std::max(wide, high) / (widest - 4));
}

void candidate_map::lay_main_grid(std::size_t squares_wanted)
{
    const box hull = hull_of(d_metrics);
    const double wide = hull.x1 - hull.x0, high = hull.y1 - hull.y0;
    const double margin = main_margin(hull);
    const double side = main_side(squares_wanted);
    // Half a square of shift puts the axes of the common symmetric sets inside a square instead of between
    // two.
    const auto squares = [&](double extent) {
        return static_cast<std::uint32_t>(std::ceil((extent + 2 * margin) / side)) | 1u;
    };
    const std::uint32_t width = squares(wide) + 2, height = squares(high) + 2;
    const double cx = (hull.x0 + hull.x1) / 2, cy = (hull.y0 + hull.y1) / 2;

    d_view.cx = cx, d_view.cy = cy;
    d_view.inverse_half_x = 1 / (side * (width / 2.0 - 1.5));
    d_view.inverse_half_y = 1 / (side * (height / 2.0 - 1.5));
    d_view.x0 = static_cast<float>(cx - side * width / 2);
    d_view.y0 = static_cast<float>(cy - side * height / 2);
    d_view.sx = d_view.sy = static_cast<float>(1 / side);
    d_view.last_x = static_cast<float>(width) - 0.5f, d_view.last_y = static_cast<float>(height) - 0.5f;
    d_view.width = width;

    const double reach = std::max(std::abs(cx), std::abs(cy)) + side * std::max(width, height);
    const bool floats_resolve =
        side > 1e-30 && reach < 1e30 && side > 16 * reach * std::numeric_limits<float>::epsilon();
    if (!floats_resolve) {
        // One square that says "outside": the shells, in double, take everything.
        d_view.x0 = d_view.y0 = 0, d_view.sx = d_view.sy = 0, d_view.last_x = d_view.last_y = 0;
        d_view.width = 1;
        add_frame({0, 0, 0, 0, 1, 1, 0});
        return;
    }
    const std::size_t frame = add_frame({d_view.x0, d_view.y0, d_view.sx, d_view.sy, width, height, 0});
    candidates all(d_metrics.size());
    for (std::size_t i = 0; i < all.size(); ++i)
        all[i] = static_cast<std::uint16_t>(i);
    d_endless = false;
    // The outermost ring stays "outside": clamping sends everything beyond, and NaN, there.
    const double infinity = std::numeric_limits<double>::infinity();
    fill(frame, {infinity, -infinity, infinity, -infinity}, 1, width - 2, 1, height - 2, all);
}

void candidate_map::lay_shells()
{
    candidates all(d_metrics.size());
    for (std::size_t i = 0; i < all.size(); ++i)
        all[i] = static_cast<std::uint16_t>(i);
    const bool no_main_grid = d_frames[0].width == 1;
    d_view.shells = shell_count;
    d_view.first_shell = static_cast<std::uint32_t>(d_frames.size());
    const double infinity = std::numeric_limits<double>::infinity();
    const box nothing{infinity, -infinity, infinity, -infinity};
    const double per_unit = shell_squares / 4.0;
    // All shell frames first: they stand side by side, child frames follow.
    for (unsigned k = 0; k < shell_count; ++k) {
        const double x_unit = std::ldexp(1 / d_view.inverse_half_x, static_cast<int>(k));
        const double y_unit = std::ldexp(1 / d_view.inverse_half_y, static_cast<int>(k));
        add_frame({d_view.cx - 2 * x_unit,
                   d_view.cy - 2 * y_unit,
                   per_unit / x_unit,
                   per_unit / y_unit,
                   shell_squares,
                   shell_squares,
                   0});
    }
    for (unsigned k = 0; k < shell_count; ++k) {
        const std::size_t frame = d_view.first_shell + k;
        d_endless = k + 1 == shell_count;
        d_tools->weight = std::ldexp(0.25, -static_cast<int>(k));
        if (k == 0 && no_main_grid) {
            fill(frame, nothing, 0, shell_squares, 0, shell_squares, all);
            continue;
        }
        // Four strips around the inner half, which belongs to the shell before. One square more on the far
        // side of a boundary that a sample may hit exactly.
        constexpr unsigned strip = shell_squares / 4 + 1, rest = shell_squares - 2 * strip;
        fill(frame, nothing, 0, shell_squares, 0, strip, all);
        fill(frame, nothing, 0, shell_squares, shell_squares - strip, strip, all);
        fill(frame, nothing, 0, strip, strip, rest, all);
        fill(frame, nothing, shell_squares - strip, strip, strip, rest, all);
    }
    d_endless = false;
}

void candidate_map::fill(std::size_t frame,
                         const box& cover,
                         unsigned ix,
                         unsigned nx,
                         unsigned iy,
                         unsigned ny,
                         const candidates& in)
{
    const square_frame f = d_frames[frame];
    box where{f.x0 + (ix - overlap) / f.sx,
              f.x0 + (ix + nx + overlap) / f.sx,
              f.y0 + (iy - overlap) / f.sy,
              f.y0 + (iy + ny + overlap) / f.sy};
    // A child's outer squares answer for all that the parent square sends, rounding included.
    if (ix == 0)
        where.x0 = std::min(where.x0, cover.x0);
    if (ix + nx == f.width)
        where.x1 = std::max(where.x1, cover.x1);
    if (iy == 0)
        where.y0 = std::min(where.y0, cover.y0);
    if (iy + ny == f.height)
        where.y1 = std::max(where.y1, cover.y1);

    const candidates list = prune(where, in);
    if (list.size() == 1) {
        for (unsigned y = iy; y < iy + ny; ++y)
            std::fill_n(d_entries.begin() + f.first + ix + std::size_t{y} * f.width, nx, list[0]);
    } else if (nx == 1 && ny == 1) {
        settle(f.first + ix + std::size_t{iy} * f.width, where, list);
    } else if (nx >= ny) {
        fill(frame, cover, ix, nx / 2, iy, ny, list);
        fill(frame, cover, ix + nx / 2, nx - nx / 2, iy, ny, list);
    } else {
        fill(frame, cover, ix, nx, iy, ny / 2, list);
        fill(frame, cover, ix, nx, iy + ny / 2, ny - ny / 2, list);
    }
}

void candidate_map::settle(std::size_t square, const box& where, const candidates& list)
{
    d_entries[square] = link_of(list);
    // In the endless shell a square stands for a whole cone and cannot be refined.
    if (list.size() > long_list && !d_endless)
        d_tools->crowds.push({static_cast<double>(list.size()) * d_tools->weight, square, where, list});
}

void candidate_map::lay_children()
{
    for (std::size_t laid = 0; laid < child_frames && !d_tools->crowds.empty() && !d_overflow;) {
        const workshop::crowded crowd = d_tools->crowds.top();
        d_tools->crowds.pop();
        const box& where = crowd.where;
        double spread = 0;
        for (const std::uint16_t i : crowd.list)
            spread = std::max({spread,
                               std::abs(d_metrics[i].re - d_metrics[crowd.list[0]].re),
                               std::abs(d_metrics[i].im - d_metrics[crowd.list[0]].im)});
        if (spread * (where.x1 - where.x0 + where.y1 - where.y0) < 64 * d_rules.blur(where))
            continue; // rounding alone keeps these together
        if (d_links.size() >= detect_view::max_links) {
            d_overflow = true;
            return;
        }
        const std::size_t child = add_frame({where.x0,
                                             where.y0,
                                             child_squares / (where.x1 - where.x0),
                                             child_squares / (where.y1 - where.y0),
                                             child_squares,
                                             child_squares,
                                             0});
        d_entries[crowd.square] = static_cast<std::uint16_t>(detect_view::open + d_links.size());
        d_links.push_back({static_cast<std::uint32_t>(child), 0, {}});
        d_tools->weight = crowd.weight / static_cast<double>(crowd.list.size()) / child_squares;
        fill(child, where, 0, child_squares, 0, child_squares, crowd.list);
        ++laid;
    }
}

std::uint16_t candidate_map::link_of(const candidates& list)
{
    const auto known = d_tools->known_lists.find(list);
    if (known != d_tools->known_lists.end())
        return known->second;
    if (d_links.size() >= detect_view::max_links) {
        d_overflow = true;
        return detect_view::outside;
    }
    const auto id = static_cast<std::uint16_t>(detect_view::open + d_links.size());
    candidate_link link{
        static_cast<std::uint32_t>(d_lists.size()), static_cast<std::uint32_t>(list.size()), {}};
    for (std::size_t k = 0; k < candidate_link::few_size; ++k)
        link.few[k] = list[std::min(k, list.size() - 1)];
    d_links.push_back(link);
    d_lists.insert(d_lists.end(), list.begin(), list.end());
    d_tools->known_lists.emplace(list, id);
    return id;
}

candidates candidate_map::prune(const box& where, const candidates& in) const
{
    return d_endless ? d_rules.prune_endless(where, in, d_view.cx, d_view.cy) : d_rules.prune(where, in);
}

} // namespace halfplane::kernels
