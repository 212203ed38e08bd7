// SPDX-License-Identifier: GPL-3.0-or-later
// near_map: a grid as fine as the closest points ask for, kept only where samples fall.
#pragma once

#include "contest.h"
#include "detect_view.h"

#include <cstdint>
#include <map>
#include <vector>

namespace halfplane::kernels {

/*!
 * A grid over the whole plane that resolves a ring of 4,096 points has more squares than a cache has room
 * for, and nearly all of them are never visited: samples fall near points. So squares are kept in pages of
 * 16 × 16, and only the pages near a point exist; a sample elsewhere is left to the candidate map. A page
 * that is won by one point throughout is a single entry.
 */
class near_map
{
public:
    /// Nothing is laid where the squares would not be clearly finer than `coarse_side`.
    near_map(const std::vector<point_metric>& metrics, const contest& rules, double coarse_side);

    /// view().pages is null where nothing was laid. Valid while this object lives and stays where it is.
    near_view view() const noexcept { return d_view; }

private:
    struct block {
        unsigned ix, nx, iy, ny; // squares
    };
    bool mark(const std::vector<double>& reach);
    std::uint64_t marked(const block& pages) const;
    void fill_pages(const block& pages, const candidates& in);
    void fill_page(std::uint32_t first, const block& squares, const block& page, const candidates& in);
    box around(const block& squares) const;
    std::uint16_t entry_of(const candidates& list);

    const std::vector<point_metric>& d_metrics;
    const contest& d_rules;
    std::vector<std::uint64_t> d_marks; // pages wanted below and left of a page: a summed-area table
    std::vector<std::uint32_t> d_pages;
    std::vector<std::uint16_t> d_entries;
    std::vector<few_candidates> d_lists;
    std::map<candidates, std::uint16_t> d_known;
    unsigned d_wide = 0, d_high = 0; // pages
    double d_x0 = 0, d_y0 = 0, d_side = 0, d_overlap = 0;
    near_view d_view{};
};

} // namespace halfplane::kernels
