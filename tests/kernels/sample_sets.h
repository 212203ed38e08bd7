// SPDX-License-Identifier: GPL-3.0-or-later
// sample_sets: constellations that the kernel tests run over, built here so that the tests stand on their
// own.
#pragma once

#include "halfplane/signal_set.h"

#include <cmath>
#include <random>
#include <string>
#include <vector>

namespace halfplane::sample_sets {

inline signal_set ring(std::size_t m)
{
    std::vector<complex> points;
    for (std::size_t i = 0; i < m; ++i)
        points.push_back(std::polar(1.0, 2 * M_PI * static_cast<double>(i) / static_cast<double>(m)));
    return signal_set::with_natural_labels(points, "ring-" + std::to_string(m));
}

/// Odd integers, `columns` × `rows`.
inline signal_set grid(int columns, int rows)
{
    std::vector<complex> points;
    for (int r = 0; r < rows; ++r)
        for (int c = 0; c < columns; ++c)
            points.emplace_back(2 * c - columns + 1, 2 * r - rows + 1);
    return signal_set::with_natural_labels(points,
                                           "grid-" + std::to_string(columns) + "x" + std::to_string(rows));
}

inline signal_set two_rings(std::size_t inner, std::size_t outer, double ratio)
{
    std::vector<complex> points;
    for (std::size_t i = 0; i < inner; ++i)
        points.push_back(
            std::polar(1.0, 2 * M_PI * (static_cast<double>(i) + 0.5) / static_cast<double>(inner)));
    for (std::size_t i = 0; i < outer; ++i)
        points.push_back(std::polar(ratio, 2 * M_PI * static_cast<double>(i) / static_cast<double>(outer)));
    return signal_set::with_natural_labels(points,
                                           "rings-" + std::to_string(inner) + "+" + std::to_string(outer));
}

inline signal_set random(std::size_t m, unsigned seed)
{
    std::mt19937_64 bits(seed);
    std::normal_distribution<double> normal;
    std::vector<complex> points(m);
    for (complex& s : points)
        s = {normal(bits), normal(bits)};
    return signal_set::with_natural_labels(points, "random-" + std::to_string(m));
}

/// Unequal priors, p_i ∝ exp(−strength·|s_i|²/Es).
inline signal_set with_shaped_priors(const signal_set& set, double strength)
{
    std::vector<double> priors;
    double sum = 0;
    for (const complex s : set.points()) {
        priors.push_back(std::exp(-strength * std::norm(s) / set.es()));
        sum += priors.back();
    }
    for (double& p : priors)
        p /= sum;
    return set.with_priors(priors).renamed(set.name() + "-shaped");
}

} // namespace halfplane::sample_sets
