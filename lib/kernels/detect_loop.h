// SPDX-License-Identifier: GPL-3.0-or-later
// detect_loop: decisions by table. Included once for each target.
#pragma once

#include "detect_view.h"

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

namespace detect_detail {

inline double metric(const point_metric& m, double x, double y)
{
    return x * m.re + y * m.im + m.constant;
}

/// The best of `count` ascending candidates; the earlier one on a tie.
inline std::uint16_t
best(const detect_view& v, const std::uint16_t* candidates, std::size_t count, double x, double y)
{
    std::uint16_t winner = candidates[0];
    double top = metric(v.metrics[winner], x, y);
    for (std::size_t i = 1; i < count; ++i) {
        const double value = metric(v.metrics[candidates[i]], x, y);
        winner = value > top ? candidates[i] : winner;
        top = value > top ? value : top;
    }
    return winner;
}

/// The best of four, or of fewer with the last one repeated. Compiled to selections: which one wins is a
/// toss-up.
inline std::uint16_t best_of_few(const detect_view& v, const std::uint16_t* candidates, double x, double y)
{
    double top = metric(v.metrics[candidates[0]], x, y);
    std::uint32_t place = 0;
    for (std::uint32_t i = 1; i < candidate_link::few_size; ++i) {
        const double value = metric(v.metrics[candidates[i]], x, y);
        place = value > top ? i : place;
        top = value > top ? value : top;
    }
    return candidates[place];
}

inline std::uint16_t best_of_all(const detect_view& v, double x, double y)
{
    std::size_t winner = 0;
    double top = metric(v.metrics[0], x, y);
    for (std::size_t i = 1; i < v.size; ++i) {
        const double value = metric(v.metrics[i], x, y);
        if (value > top)
            top = value, winner = i;
    }
    return static_cast<std::uint16_t>(winner);
}

inline std::uint32_t clamp_square(double t, std::uint32_t squares)
{
    if (!(t > 0))
        return 0;
    return t < squares ? static_cast<std::uint32_t>(t) : squares - 1;
}

inline double power_of_two(int exponent) // −1022 … 1023
{
    const std::uint64_t bits = static_cast<std::uint64_t>(1023 + exponent) << 52;
    double value;
    __builtin_memcpy(&value, &bits, sizeof value);
    return value;
}

/// Entry of a finite sample in the shells around the main grid.
inline std::uint16_t shell_entry(const detect_view& v, double x, double y)
{
    const double u = (x - v.cx) * v.inverse_half_x, w = (y - v.cy) * v.inverse_half_y;
    const double reach = __builtin_fmax(__builtin_fabs(u), __builtin_fabs(w));
    std::uint64_t bits;
    __builtin_memcpy(&bits, &reach, sizeof bits);
    int shell = static_cast<int>(bits >> 52) - 1023;
    if (shell < 0)
        shell = 0;
    const double shrink = power_of_two(-shell);
    const std::uint32_t ix = clamp_square((u * shrink + 2) * (shell_squares / 4.0), shell_squares);
    const std::uint32_t iy = clamp_square((w * shrink + 2) * (shell_squares / 4.0), shell_squares);
    const std::uint32_t last = v.shells - 1;
    const std::uint32_t which =
        static_cast<std::uint32_t>(shell) < last ? static_cast<std::uint32_t>(shell) : last;
    return v.entries[v.frames[v.first_shell + which].first + ix + iy * shell_squares];
}

/// Entry of a sample in the main grid.
inline std::uint16_t main_entry(const detect_view& v, float x, float y)
{
    float tx = (x - v.x0) * v.sx, ty = (y - v.y0) * v.sy;
    tx = tx > 0 ? tx : 0; // NaN too
    ty = ty > 0 ? ty : 0;
    tx = tx < v.last_x ? tx : v.last_x;
    ty = ty < v.last_y ? ty : v.last_y;
    return v.entries[static_cast<std::uint32_t>(tx) + static_cast<std::uint32_t>(ty) * v.width];
}

/// Follows an open entry to a decision.
inline std::uint16_t resolve(const detect_view& v, std::uint16_t entry, float in_x, float in_y)
{
    if (!(__builtin_fabsf(in_x) <= __FLT_MAX__ && __builtin_fabsf(in_y) <= __FLT_MAX__))
        return detect_view::outside;
    const double x = in_x, y = in_y;
    if (entry == detect_view::outside)
        entry = shell_entry(v, x, y);
    while (entry >= detect_view::open) {
        const candidate_link link = v.links[entry - detect_view::open];
        if (link.count)
            return best(v, v.lists + link.at, link.count, x, y);
        const square_frame& f = v.frames[link.at];
        entry = v.entries[f.first + clamp_square((x - f.x0) * f.sx, f.width) +
                          clamp_square((y - f.y0) * f.sy, f.height) * f.width];
    }
    return entry;
}

constexpr std::size_t block = 512;

/// Decisions by the near map, n ≤ block. Nothing branches on the data but the rare samples left over.
inline void decide_near(const detect_view& v, const float* in, std::uint16_t* out, std::size_t n)
{
    const near_view& g = v.near;
    constexpr std::int32_t within_page = (1 << near_view::page_bits) - 1;
    std::uint32_t page[block], within[block];
    std::uint16_t undecided[block];
    const float x0 = g.x0, y0 = g.y0, scale = g.scale, last_x = g.last_x, last_y = g.last_y;
    const std::int32_t wide = static_cast<std::int32_t>(g.wide);
    for (std::size_t k = 0; k < n; ++k) {
        float tx = (in[2 * k] - x0) * scale, ty = (in[2 * k + 1] - y0) * scale;
        tx = tx > 0 ? tx : 0; // NaN too
        ty = ty > 0 ? ty : 0;
        tx = tx < last_x ? tx : last_x;
        ty = ty < last_y ? ty : last_y;
        const std::int32_t ix = static_cast<std::int32_t>(tx), iy = static_cast<std::int32_t>(ty);
        page[k] =
            static_cast<std::uint32_t>((ix >> near_view::page_bits) + (iy >> near_view::page_bits) * wide);
        within[k] =
            static_cast<std::uint32_t>((ix & within_page) | (iy & within_page) << near_view::page_bits);
    }
    for (std::size_t k = 0; k < n; ++k) {
        const std::uint32_t p = g.pages[page[k]];
        page[k] = (p >> 1) + (within[k] & (0u - (p & 1u)));
    }
    std::size_t open = 0;
    for (std::size_t k = 0; k < n; ++k) {
        const std::uint16_t entry = g.entries[page[k]];
        out[k] = entry;
        undecided[open] = static_cast<std::uint16_t>(k);
        open += entry >> 15;
    }
    for (std::size_t j = 0; j < open; ++j) {
        const std::size_t k = undecided[j];
        const std::uint16_t entry = out[k];
        const float x = in[2 * k], y = in[2 * k + 1];
        out[k] = entry == near_view::elsewhere ? resolve(v, main_entry(v, x, y), x, y)
                                               : best_of_few(v,
                                                             g.lists[entry - near_view::open].index,
                                                             static_cast<double>(x),
                                                             static_cast<double>(y));
    }
}

} // namespace detect_detail

void decide(const detect_view& v, const float* in, std::uint16_t* out, std::size_t count)
{
    using namespace detect_detail;
    if (v.scan_all) {
        for (std::size_t k = 0; k < count; ++k) {
            const float x = in[2 * k], y = in[2 * k + 1];
            const bool finite = __builtin_fabsf(x) <= __FLT_MAX__ && __builtin_fabsf(y) <= __FLT_MAX__;
            out[k] = finite ? best_of_all(v, x, y) : detect_view::outside;
        }
        return;
    }
    if (v.near.pages) {
        for (; count > 0;) {
            const std::size_t n = count < block ? count : block;
            decide_near(v, in, out, n);
            in += 2 * n, out += n, count -= n;
        }
        return;
    }
    std::uint32_t square[block];
    std::uint16_t undecided[block];
    for (; count > 0;) {
        const std::size_t n = count < block ? count : block;
        const float x0 = v.x0, y0 = v.y0, sx = v.sx, sy = v.sy, last_x = v.last_x, last_y = v.last_y;
        const std::int32_t width = static_cast<std::int32_t>(v.width);
        for (std::size_t k = 0; k < n; ++k) {
            float tx = (in[2 * k] - x0) * sx, ty = (in[2 * k + 1] - y0) * sy;
            tx = tx > 0 ? tx : 0; // NaN too
            ty = ty > 0 ? ty : 0;
            tx = tx < last_x ? tx : last_x;
            ty = ty < last_y ? ty : last_y;
            square[k] = static_cast<std::uint32_t>(static_cast<std::int32_t>(tx) +
                                                   static_cast<std::int32_t>(ty) * width);
        }
        // Nothing here branches on the data: what is open is noted and settled afterwards.
        std::size_t open = 0;
        for (std::size_t k = 0; k < n; ++k) {
            const std::uint16_t entry = v.entries[square[k]];
            out[k] = entry;
            undecided[open] = static_cast<std::uint16_t>(k);
            open += entry >> 15;
        }
        for (std::size_t j = 0; j < open; ++j) {
            const std::size_t k = undecided[j];
            const std::uint16_t entry = out[k];
            // Samples that are not finite are clamped to the outermost ring, which is all outside.
            if (entry != detect_view::outside) {
                const candidate_link& link = v.links[entry - detect_view::open];
                if (link.count - 1 < candidate_link::few_size) {
                    out[k] = best_of_few(
                        v, link.few, static_cast<double>(in[2 * k]), static_cast<double>(in[2 * k + 1]));
                    continue;
                }
            }
            out[k] = resolve(v, entry, in[2 * k], in[2 * k + 1]);
        }
        in += 2 * n, out += n, count -= n;
    }
}

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
