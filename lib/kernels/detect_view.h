// SPDX-License-Identifier: GPL-3.0-or-later
// detect_view: the tables of a candidate map as plain pointers, the form in which the compiled-many-times
// loops read them.
#pragma once

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

/// Metric of a point at sample (x, y): x·re + y·im + constant, evaluated in double in exactly this order.
struct point_metric {
    double re, im, constant;
};

/// A grid of rectangles: square (ix, iy) = (⌊(x − x0)·sx⌋, ⌊(y − y0)·sy⌋) has entry `first + ix + iy·width`.
struct square_frame {
    double x0, y0, sx, sy;
    std::uint32_t width, height, first;
};

/// What an open entry leads to: `count` candidates from `lists[at]` on, or frame `at` where count is 0. Lists
/// of up to four stand in `few` too, the last one repeated, so that they are settled without a branch.
struct candidate_link {
    static constexpr std::size_t few_size = 4;
    std::uint32_t at, count;
    std::uint16_t few[few_size];
};

/// Two to four candidates; the last one repeated.
struct few_candidates {
    static constexpr std::size_t size = 4;
    std::uint16_t index[size];
};

/*!
 * A fine grid kept in pages where samples fall (near_map.h). Square (ix, iy), in float as in detect_view, is
 * in page (ix/16, iy/16); `pages` holds the place of the page's first entry, doubled, plus 1, or without the
 * 1 that of the one entry which its 256 squares share.
 */
struct near_view {
    static constexpr unsigned page_bits = 4;
    // An entry below `open` is the decision itself; open + k leads to lists[k]; `elsewhere` to the main grid.
    static constexpr std::uint16_t open = 0x8000;
    static constexpr std::uint16_t elsewhere = 0xffff;

    const std::uint32_t* pages; // null: no such grid
    const std::uint16_t* entries;
    const few_candidates* lists;
    float x0, y0, scale, last_x, last_y;
    std::uint32_t wide; // pages
};

struct detect_view {
    // An entry below `open` is the decision itself; open + k leads to links[k]; `outside` to the shells.
    static constexpr std::uint16_t open = 0x8000;
    static constexpr std::uint16_t outside = 0xffff;
    static constexpr std::uint32_t max_links = 0x7ffe;

    const point_metric* metrics;
    std::size_t size; // points
    const std::uint16_t* entries;
    const candidate_link* links;
    const std::uint16_t* lists;
    const square_frame* frames;
    near_view near; // asked first where it is there

    // Main grid: entries[0 …], its coordinates in float.
    float x0, y0, sx, sy, last_x, last_y;
    std::uint32_t width;

    // Shells: frames[first_shell + k] serves samples with 2^k ≤ max(|x − cx|/half_x, |y − cy|/half_y) <
    // 2^(k+1).
    double cx, cy, inverse_half_x, inverse_half_y;
    std::uint32_t first_shell, shells;
    bool scan_all; // points of extreme size: no tables, every point is compared
};

constexpr unsigned shell_squares = 32; // a side; 8 to the unit of the shell's inner half width

} // namespace halfplane::kernels
