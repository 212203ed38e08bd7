// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: one of its two games, and what the files of the class share.
#pragma once

#include "halfplane/verdict.h"

#include <cstddef>
#include <vector>

namespace halfplane {

constexpr std::size_t most_verdict_levels = 40;
constexpr double weight_of_shortest = 0.8; // of the block lengths

/// One of the two games, so that both are played by the same code.
struct verdict::side {
    const std::vector<double>& clear;
    std::vector<double> log_weights;
    std::vector<double> level::*sums;
    std::vector<double> level::*squares;

    double log_wealth(const level& l, std::size_t bet) const
    {
        return static_cast<double>(l.blocks - l.hits) * clear[bet] + (l.*sums)[bet];
    }
};

} // namespace halfplane
