// SPDX-License-Identifier: GPL-3.0-or-later
// report_parts: pure conversions from measured things to parts of the report.
#pragma once

#include "expected_errors.h"
#include "halfplane/gauge.h"
#include "halfplane/interval.h"
#include "halfplane/link/watch.h"
#include "halfplane/losses.h"
#include "halfplane/premises.h"
#include "halfplane/shortfall.h"

#include <optional>
#include <string>
#include <vector>

namespace halfplane::link {

/// Most transitions that a report lists: those counted most often.
inline constexpr std::size_t most_transitions = 4096;

/// Intervals of the run, widened where errors cluster.
struct run_intervals {
    double dispersion = 1; ///< of error counts over blocks
    double confidence;
    double frame_dispersion = 1; ///< of frame errors
    interval ser(std::uint64_t errors, std::uint64_t symbols) const;
    interval ber(const tally& counts) const;
    interval fer(std::uint64_t errors, std::uint64_t frames) const;
};

std::string utc_now(); ///< RFC 3339, whole seconds
nlohmann::json settings_of(const signal_set& set, const predictor& p, const watch_options& options);

report counts_and_gauge(const signal_set& set,
                        const tally& counts,
                        const std::optional<gauge_result>& fit,
                        const run_intervals& ends);
/// What least squares and the blind gauge have in common.
struct gauged {
    complex gain, offset;
    double es_n0, es_n0_db_se;
};
void put_gauge(report& out, const signal_set& set, const gauged& fit);
report rates_of(const rates& r);
report rates_of(const expected_errors& e);
report account_of(const tally& counts, std::uint64_t pending);
/// Rows of [from, to, count, expected], `expected` row by row or empty; `unlisted` becomes what was cut off.
report transitions_of(const transition_counts& counted,
                      const std::vector<double>& expected,
                      std::size_t set_size,
                      std::uint64_t& unlisted);
report input_of(const input_snr& input);
report shortfall_of(const shortfall& s);
report lock_of(const lock_status& lock);
report losses_of(const std::vector<loss>& losses);
report premises_of(const std::vector<premise>& premises);
/// Names of those that fail.
report failing_of(const std::vector<premise>& premises);
report seconds_of(const second_counts& s);
/// Frames of `now`, of those since `before` where there is one; nothing where none are counted.
report frames_of(const trial_state& now, const frame_counts& before, const run_intervals& ends);
report verdict_of(const error_target& target,
                  const verdict& bets,
                  std::uint64_t excluded,
                  std::uint64_t frame_length);
void put_interval(report& out, const std::string& name, double rate, const interval& ends);
/// \param counts of the run. Symbols before the lock are no excluded ones here, nor such as were never known
/// in advance: nothing was claimed of them.
report verdict_of(const trial_state& trial, const tally& counts);

} // namespace halfplane::link
