// SPDX-License-Identifier: GPL-3.0-or-later
// interval: confidence intervals for counted error rates.
#pragma once

#include <cstdint>
#include <optional>

namespace halfplane {

/// Both ends of a confidence interval; with no errors counted only the upper end stands.
struct interval {
    std::optional<double> low;
    double high;
};

/// Largest relative error of both ends; measured on counts to 2000 of 1e15 trials.
inline constexpr double interval_accuracy = 1e-9;

/*!
 * Exact binomial interval (Clopper and Pearson, Biometrika 26 (1934) 404).
 * \param errors     counted errors, ≤ trials
 * \param trials     > 0
 * \param confidence two-sided, in (0, 1); with errors = 0 the upper end is one-sided
 * \throws std::invalid_argument outside these ranges
 */
interval binomial_interval(std::uint64_t errors, std::uint64_t trials, double confidence);

/*!
 * Interval for a rate whose errors come in clumps: the exact Poisson interval (Garwood, Biometrika 28 (1936)
 * 437) of errors / dispersion, scaled back.
 * \param errors     counted (bit) errors
 * \param trials     counted (bit) trials > 0
 * \param dispersion Σh²/Σh of the clump sizes h, ≥ 1 (smaller values are taken as 1)
 */
interval clumped_interval(std::uint64_t errors, std::uint64_t trials, double dispersion, double confidence);

} // namespace halfplane
