// SPDX-License-Identifier: GPL-3.0-or-later
// reporting: the other half of watch: totals of the run, predictions, and the report they make.
#pragma once

#include "explanation.h"
#include "halfplane/carry.h"
#include "halfplane/link/watch.h"
#include "halfplane/ser_curve.h"
#include "halfplane/shortfall.h"
#include "live_part.h"
#include "report_parts.h"
#include "running_prediction.h"

namespace halfplane::link {

struct watch::reporting {
    /// Largest set for which every P(j|i) is evaluated each window; beyond, transitions stand without
    /// expectation.
    static constexpr std::size_t most_points_for_transitions = 256;
    /// Judged symbols gauged together for the shortfall: fewer, and the scatter of the gauge bends the curve.
    static constexpr std::uint64_t stretch_symbols = 10000;

    reporting(const signal_set& set, watch_options options);
    report report_of(window&& w, bool final);
    nlohmann::json settings() const { return settings_of(d_set, d_predictor, d_options); }

    /// All but what was known of lock and input. See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("sequence", d_sequence);
        a("counts", d_counts);
        a("fit", d_fit);
        a("prediction", d_prediction);
        a("decoded_counts", d_decoded_counts);
        a("decoded_fit", d_decoded_fit);
        a("decoded_prediction", d_decoded_prediction);
        a("live", d_live);
        a("at_decision", d_at_decision);
        a("last_stretch", d_last_stretch);
        a("open_stretch", d_open_stretch);
        a("explanation", d_explanation);
        a("at_input", d_at_input);
        a("errors_at_input", d_errors_at_input);
        a("input_variance_sum", d_input_variance_sum);
        auto all_slips = slips();
        a("slips", all_slips);
        d_slips_before += all_slips - slips();
        a("run", d_run);
        d_frames = d_run.trial.frames;
    }

    /// The counting half's state at the end of the last window.
    struct run_state {
        block_counts blocks;
        second_counts seconds;
        trial_state trial;
        double map_n0 = 0;

        template <typename Archive>
        void carry(Archive& a)
        {
            a("blocks", blocks);
            a("seconds", seconds);
            auto saved = trial.save();
            a("trial", saved);
            if constexpr (std::is_same_v<Archive, carry_reader>)
                trial.restore(saved);
            a("map_n0", map_n0);
        }
    };
    run_state d_run;
    tally d_counts; ///< of the run

private:
    std::uint64_t slips() const { return d_slips_before + (d_lock ? d_lock->slips : 0); }
    void add_stretch(const window& w);
    void add_input(const window& w);

    /// Bunching of errors is measured among judged symbols alone.
    run_intervals unbunched() const { return {1, d_options.confidence}; }
    report window_part(const window& w, const run_intervals& ends);
    report total(const window& w, const std::optional<gauge_result>& fit, const run_intervals& ends) const;
    loss_question asked(const std::optional<shortfall>& at_the_input) const;
    std::optional<shortfall> at_decision(const run_intervals& ends) const;
    std::optional<shortfall> at_input(const run_intervals& ends) const;

    const signal_set d_set;
    const watch_options d_options;
    const predictor d_predictor;
    const ser_curve d_curve;
    const std::string d_digest;
    const rate_memory d_rates{d_predictor};

    // The run so far.
    std::uint64_t d_sequence = 0, d_slips_before = 0; // slips of earlier runs
    gauge d_fit;
    frame_counts d_frames;
    std::optional<lock_status> d_lock;
    std::optional<input_snr> d_input;

    running_prediction d_prediction;

    // Symbols known only by decoding, and those that nobody knows.
    tally d_decoded_counts;
    gauge d_decoded_fit;
    running_prediction d_decoded_prediction;
    live_part d_live;

    // Shortfall at the decision: full stretches but the last, the last full one, and what followed it.
    snr_record d_at_decision;
    gauge d_last_stretch, d_open_stretch;

    explanation d_explanation;

    // Shortfall at the input.
    snr_record d_at_input;
    std::uint64_t d_errors_at_input = 0;
    double d_input_variance_sum = 0; // Σ n·se²
};

} // namespace halfplane::link
