// SPDX-License-Identifier: GPL-3.0-or-later
// reporting: the other half of watch: totals of the run, predictions, and the report they make.
#pragma once

#include "halfplane/link/watch.h"
#include "halfplane/ser_curve.h"
#include "halfplane/shortfall.h"

#include <array>

namespace halfplane::link {

/// Σ n·rate over windows, by rung: what errors the predictions expect.
struct expected_errors {
    static constexpr std::size_t rungs = 4;
    std::array<long double, rungs> symbol{},
        bit{};                       ///< Σ n·SER, Σ n·BER in the order exact, facing, union, nearest
    std::uint64_t symbols = 0;       ///< n: judged symbols spoken of
    std::vector<double> transitions; ///< Σ n_i·P(j|i), row by row; empty for large sets

    void add(const predictor& p, const rates& at_es_n0, double es_n0, const tally& counts);
};

struct watch::reporting {
    /// Largest set for which every P(j|i) is evaluated each window; beyond, transitions stand without
    /// expectation.
    static constexpr std::size_t most_points_for_transitions = 256;
    /// Most transitions that a report lists: those counted most often.
    static constexpr std::size_t most_transitions = 4096;
    /// Judged symbols gauged together for the shortfall: fewer, and the scatter of the gauge bends the curve.
    static constexpr std::uint64_t stretch_symbols = 10000;

    reporting(const signal_set& set, watch_options options);
    report report_of(window&& w, bool final);
    nlohmann::json settings() const;

private:
    /// The rungs at this Es/N0; the last answer is kept, as window and run mostly ask for the same.
    const rates& rates_at(double es_n0) const;
    void add_prediction(const window& w);
    void add_stretch(const window& w);
    void add_input(const window& w);
    std::optional<expected_errors> prediction_of_run() const;

    struct run_intervals {
        double dispersion = 1; ///< of error counts over blocks
        double confidence;
        interval ser(std::uint64_t errors, std::uint64_t symbols) const;
        interval ber(const tally& counts) const;
    };
    report counts_and_gauge(const tally& counts,
                            const std::optional<gauge_result>& fit,
                            const run_intervals& ends) const;
    report total(const window& w, const std::optional<gauge_result>& fit, const run_intervals& ends) const;
    report transitions(const std::optional<expected_errors>& expected, std::uint64_t& unlisted) const;
    std::optional<shortfall> at_decision(const run_intervals& ends) const;
    std::optional<shortfall> at_input(const run_intervals& ends) const;

    const signal_set d_set;
    const watch_options d_options;
    const predictor d_predictor;
    const ser_curve d_curve;
    const std::string d_digest;
    mutable std::optional<std::pair<double, rates>> d_last_rates;

    // The run so far.
    std::uint64_t d_sequence = 0;
    tally d_counts;
    gauge d_fit;
    std::optional<lock_status> d_lock;
    std::optional<input_snr> d_input;

    // Predictions: windows that cannot be gauged wait for one that can.
    expected_errors d_expected;
    tally d_waiting_counts;
    gauge d_waiting_fit;

    // Shortfall at the decision: full stretches but the last, the last full one, and what followed it.
    snr_record d_at_decision;
    gauge d_last_stretch, d_open_stretch;

    // Shortfall at the input.
    snr_record d_at_input;
    std::uint64_t d_errors_at_input = 0;
    double d_input_variance_sum = 0; // Σ n·se²
};

} // namespace halfplane::link
