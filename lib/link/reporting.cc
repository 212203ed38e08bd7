// SPDX-License-Identifier: GPL-3.0-or-later
// reporting: totals, predictions and shortfall, and the report as a document.
#include "reporting.h"

#include "halfplane/link/sha256.h"

#include <cmath>

namespace halfplane::link {

watch::reporting::reporting(const signal_set& set, watch_options options)
    : d_counts(set), d_set(set), d_options(std::move(options)),
      d_predictor(set, std::make_shared<awgn>(), d_options.rule), d_curve(d_predictor),
      d_digest(sha256(settings().dump())), d_prediction(set, set.size() <= most_points_for_transitions),
      d_decoded_counts(set), d_decoded_prediction(set, false), d_live(set)
{
    d_run.trial = trial(set, d_options.trial, d_options.confidence).state();
}

namespace {

snr_record::stretch stretch_of(const gauge_result& fit, std::uint64_t symbols)
{
    return {symbols, to_db(fit.es_n0), fit.es_n0_db_se * fit.es_n0_db_se, fit.error_influence};
}

} // namespace

void watch::reporting::add_stretch(const window& w)
{
    d_open_stretch.merge(w.fit);
    if (d_open_stretch.count() < stretch_symbols || !d_open_stretch.solve(d_set))
        return;
    if (const auto fit = d_last_stretch.solve(d_set))
        d_at_decision.add(stretch_of(*fit, d_last_stretch.count()));
    d_last_stretch = d_open_stretch;
    d_open_stretch = {};
}

void watch::reporting::add_input(const window& w)
{
    for (const auto& part : w.inputs) {
        d_at_input.add({part.symbols, part.input.es_n0_db, 0, 0});
        d_errors_at_input += part.errors;
        d_input_variance_sum +=
            static_cast<double>(part.symbols) * part.input.es_n0_db_se * part.input.es_n0_db_se;
    }
}

std::optional<shortfall> watch::reporting::at_decision(const run_intervals& ends) const
{
    auto record = d_at_decision;
    auto rest = d_last_stretch;
    rest.merge(d_open_stretch);
    if (rest.count() > 0) {
        const auto fit = rest.solve(d_set);
        if (!fit)
            return std::nullopt;
        record.add(stretch_of(*fit, rest.count()));
    }
    if (record.symbols() == 0)
        return std::nullopt;
    return find_shortfall(record,
                          d_curve,
                          {d_counts.symbol_errors,
                           ends.ser(d_counts.symbol_errors, d_counts.symbols),
                           ends.dispersion,
                           0,
                           ends.confidence});
}

std::optional<shortfall> watch::reporting::at_input(const run_intervals& ends) const
{
    const auto n = d_at_input.symbols();
    if (n == 0)
        return std::nullopt;
    return find_shortfall(d_at_input,
                          d_curve,
                          {d_errors_at_input,
                           ends.ser(d_errors_at_input, n),
                           ends.dispersion,
                           d_input_variance_sum / static_cast<double>(n),
                           ends.confidence});
}

report watch::reporting::total(const window& w,
                               const std::optional<gauge_result>& fit,
                               const run_intervals& ends) const
{
    report out = counts_and_gauge(d_set, d_counts, fit, ends);
    auto account = account_of(d_counts, w.pending);
    if (d_options.symbol_rate > 0)
        out["seconds"] = account["in"].get<double>() / d_options.symbol_rate;
    out.update(account);
    if (d_lock)
        out["slips"] = slips();
    out.update(frames_of(w.trial, frame_counts(), ends));
    if (const auto d = w.blocks.dispersion())
        out["dispersion"] = *d;
    if (const auto d = w.trial.frame_blocks.dispersion())
        out["frame_dispersion"] = *d;
    if (d_counts.bit_errors > 0)
        out["bit_dispersion"] = d_counts.bit_dispersion();
    const auto expected = d_prediction.of_run(d_rates, d_set, d_fit);
    if (expected)
        out["predicted"] = rates_of(*expected);
    out["by_bit"] = d_counts.by_bit;
    std::uint64_t unlisted = 0;
    out["transitions"] = transitions_of(d_counts.transitions,
                                        expected ? expected->transitions : std::vector<double>(),
                                        d_set.size(),
                                        unlisted);
    if (unlisted > 0)
        out["transitions_unlisted"] = unlisted;
    if (d_decoded_counts.symbols > 0) {
        out["decoded_part"] =
            counts_and_gauge(d_set, d_decoded_counts, d_decoded_fit.solve(d_set), unbunched());
        if (const auto of_decoded = d_decoded_prediction.of_run(d_rates, d_set, d_decoded_fit))
            out["decoded_part"]["predicted"] = rates_of(*of_decoded);
    }
    if (auto of_live = d_live.of_run(d_rates, d_counts.live); !of_live.empty())
        out["live_part"] = std::move(of_live);
    return out;
}

/// Under a declared Es/N0 that changed, the constant one that expects as many errors.
loss_question watch::reporting::asked(const std::optional<shortfall>& at_the_input) const
{
    loss_question question;
    if (const auto fit = d_fit.solve(d_set))
        question.gauged_n0 = fit->n0 / d_set.es();
    if (const auto n = d_at_input.symbols(); n > 0) {
        const double ln_ser = d_at_input.at(d_curve, 0).ln_errors - std::log(static_cast<double>(n));
        question.input_es_n0_db = es_n0_db_of(d_curve, ln_ser, d_at_input.highest_db());
        if (at_the_input && at_the_input->db)
            question.achieved_es_n0_db = *question.input_es_n0_db - *at_the_input->db;
    } else if (d_counts.symbol_errors > 0) {
        const double ser =
            static_cast<double>(d_counts.symbol_errors) / static_cast<double>(d_counts.symbols);
        question.achieved_es_n0_db = es_n0_db_of(d_curve, std::log(ser), 10);
    }
    return question;
}

report watch::reporting::window_part(const window& w, const run_intervals& ends)
{
    const auto fit = w.fit.solve(d_set);
    report out = {{"first_symbol", w.first_symbol}};
    out.update(counts_and_gauge(d_set, w.counts, fit, ends));
    out.update(frames_of(w.trial, d_frames, ends));
    d_frames = w.trial.frames;
    if (fit)
        out["predicted"] = rates_of(d_rates.at(fit->es_n0));
    if (w.decoded) {
        const auto decoded_fit = w.decoded_fit.solve(d_set);
        out["decoded_part"] = counts_and_gauge(d_set, *w.decoded, decoded_fit, unbunched());
        if (decoded_fit)
            out["decoded_part"]["predicted"] = rates_of(d_rates.at(decoded_fit->es_n0));
    }
    if (!d_live.of_window().empty())
        out["live_part"] = d_live.of_window();
    return out;
}

report watch::reporting::report_of(window&& w, bool final)
{
    d_counts.merge(w.counts);
    d_run = {w.blocks, w.seconds, w.trial, w.map_n0};
    d_fit.merge(w.fit);
    d_explanation.add(w.residuals);
    if (w.lock)
        d_lock = w.lock;
    if (w.input)
        d_input = w.input;
    d_prediction.add(d_rates, d_set, w.counts, w.fit);
    if (w.decoded) {
        d_decoded_counts.merge(*w.decoded);
        d_decoded_fit.merge(w.decoded_fit);
        d_decoded_prediction.add(d_rates, d_set, *w.decoded, w.decoded_fit);
    }
    d_live.add(d_rates, w.live, w.fit.solve(d_set));
    add_stretch(w);
    add_input(w);
    const run_intervals ends{w.blocks.dispersion().value_or(1),
                             d_options.confidence,
                             w.trial.frame_blocks.dispersion().value_or(1)};

    report out;
    out["schema"] = "halfplane/report/1";
    out["version"] = HALFPLANE_VERSION;
    out["settings_sha256"] = d_digest;
    if (auto time = d_options.clock ? d_options.clock() : utc_now(); !time.empty())
        out["time"] = std::move(time);
    out["sequence"] = d_sequence++;
    if (final)
        out["final"] = true;
    if (!d_set.name().empty())
        out["set"] = d_set.name();
    if (!d_options.pattern.empty())
        out["pattern"] = d_options.pattern;
    out["law"] = d_predictor.channel().name();
    out["detector"] = d_predictor.rule() == detector::map ? "map" : "ml";
    out["decisions"] = d_options.receiver_decisions ? "receiver" : "own";
    out["confidence"] = d_options.confidence;

    out["window"] = window_part(w, ends);
    out["total"] = total(w, d_fit.solve(d_set), ends);

    if (d_input)
        out["input"] = input_of(*d_input);
    report shortfalls;
    const auto input_shortfall = at_input(ends);
    for (const auto& [place, found] :
         {std::pair{"decision", at_decision(ends)}, std::pair{"input", input_shortfall}})
        if (found)
            if (auto ends_found = shortfall_of(*found); !ends_found.empty())
                shortfalls[place] = std::move(ends_found);
    d_explanation.refresh(d_predictor, d_curve, asked(input_shortfall), final);
    // At the decision the curve is asked at a gauged Es/N0, which means what it says where the premises hold.
    if (shortfalls.contains("decision"))
        if (auto failing = failing_of(d_explanation.premises()); !failing.empty())
            shortfalls["decision"]["doubted_by"] = std::move(failing);
    if (!shortfalls.empty())
        out["shortfall"] = std::move(shortfalls);
    if (d_explanation.symbols() > 0)
        out["explained_symbols"] = d_explanation.symbols();
    if (!d_explanation.losses().empty())
        out["losses"] = losses_of(d_explanation.losses());
    if (!d_explanation.premises().empty())
        out["premises"] = premises_of(d_explanation.premises());
    if (d_lock)
        out["lock"] = lock_of(*d_lock);
    if (w.seconds.all() > 0)
        out["seconds"] = seconds_of(w.seconds);
    if (w.trial.bets)
        out["verdict"] = verdict_of(w.trial, d_counts);
    return out;
}

} // namespace halfplane::link
