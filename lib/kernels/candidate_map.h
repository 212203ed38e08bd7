// SPDX-License-Identifier: GPL-3.0-or-later
// candidate_map: for every small rectangle of the plane, the few points that can win a decision somewhere in
// it.
#pragma once

#include "contest.h"
#include "detect_view.h"
#include "halfplane/signal_set.h"
#include "near_map.h"

#include <cstddef>
#include <cstdint>
#include <memory>
#include <vector>

namespace halfplane::kernels {

/*!
 * The tables behind point_decider. Three layers, all of the same make (frames of squares):
 *
 * - a *main grid* over the points and some margin, whose coordinates cost two float operations;
 * - *shells* around it, each twice as wide as the one before, the last of them without end;
 * - *child frames* of 8 × 8 squares inside a square where many points compete.
 *
 * Where points lie too close together for the main grid, a near_map goes ahead of them.
 */
class candidate_map
{
public:
    /// \param bias M additive terms of the metric (MAP), or empty
    candidate_map(const signal_set& set, const std::vector<double>& bias);

    /// Pointers into this object, for the loops. Valid while it lives and stays where it is.
    detect_view view() const noexcept;

private:
    double main_margin(const box& hull) const;
    double main_side(std::size_t squares_wanted) const;
    void lay_main_grid(std::size_t squares_wanted);
    void lay_shells();
    void lay_children();
    void fill(std::size_t frame,
              const box& cover,
              unsigned ix,
              unsigned nx,
              unsigned iy,
              unsigned ny,
              const candidates& in);
    void settle(std::size_t square, const box& where, const candidates& list);
    candidates prune(const box& where, const candidates& in) const;
    std::uint16_t link_of(const candidates& list);
    std::size_t add_frame(const square_frame& f);

    std::vector<point_metric> d_metrics;
    contest d_rules;
    std::unique_ptr<near_map> d_near;
    std::vector<square_frame> d_frames;
    std::vector<std::uint16_t> d_entries;
    std::vector<candidate_link> d_links;
    std::vector<std::uint16_t> d_lists;
    struct workshop;
    workshop* d_tools = nullptr; // while building only
    detect_view d_view{};
    bool d_endless = false; // the frame being filled reaches to infinity
    bool d_overflow = false;
};

} // namespace halfplane::kernels
