// SPDX-License-Identifier: GPL-3.0-or-later
// planning: how long to count before an error rate is shown, and how likely such a test is to pass.
#pragma once

#include <cstdint>
#include <vector>

namespace halfplane {

/*!
 * The test: count `trials` independent trials (bits, symbols or frames) and pass with `allowed` errors at
 * most. A link exactly at the target passes with probability 1 − confidence at most (the consumer's risk).
 */
struct count_test {
    std::uint64_t trials;
    std::uint64_t allowed;
};

/*!
 * The shortest such test: the least n with P(errors ≤ allowed | n, target) ≤ 1 − confidence. With no errors
 * allowed n = ⌈ln(1 − confidence)/ln(1 − target)⌉; for small targets n ≈ χ²(confidence; 2·allowed +
 * 2)/(2·target). Exact, except beyond 1e15 trials, where n is right to 1e-9 of itself. \param target error
 * rate to be shown, in (0, 1) \param confidence in (0, 1) \throws std::invalid_argument outside these ranges,
 * or where more than 1e19 trials are needed
 */
count_test plan_test(double target, double confidence, std::uint64_t allowed = 0);

/*!
 * Operating characteristic: the chance that the test passes at a true error rate.
 * \param rate in [0, 1] \throws std::invalid_argument otherwise, or where allowed ≥ trials
 * Relative error 1e-10 down to 1e-300.
 */
double pass_probability(const count_test& test, double rate);

/// The true error rate at which the test passes with a given chance in (0, 1): pass_probability's inverse.
double rate_at_pass_probability(const count_test& test, double chance);

/// One line of a plan.
struct plan_row {
    count_test test;
    double symbols;           ///< channel symbols that carry the trials
    double seconds;           ///< at the symbol rate; 0 where none was given
    double rate_half_pass;    ///< true rate at which half of the tests pass
    double rate_usually_pass; ///< true rate at which a share `confidence` of the tests pass: be this good
                              ///< (producer's risk)
};

/// What is counted, and how fast it comes.
struct plan_request {
    double target; ///< error rate a trial
    double confidence = 0.95;
    double trials_per_symbol = 1; ///< bits a symbol for a BER, 1 for a SER; > 0
    double symbol_rate = 0;       ///< symbols a second; 0 where unknown
    /// Errors that come in clumps (wrong bits of one symbol) stretch the test by their dispersion Σh²/Σh ≥ 1:
    /// so many trials count as one, and `allowed` counts clumps.
    double dispersion = 1;
};

/// One row for each number of allowed errors. \throws std::invalid_argument naming the value
std::vector<plan_row> plan(const plan_request& request,
                           const std::vector<std::uint64_t>& allowed = {0, 1, 3, 10, 30, 100});

} // namespace halfplane
