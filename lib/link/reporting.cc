// SPDX-License-Identifier: GPL-3.0-or-later
// reporting: totals, predictions and shortfall, and the report as a document.
#include "reporting.h"

#include "halfplane/interval.h"
#include "halfplane/link/sha256.h"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <ctime>

namespace halfplane::link {

namespace {

constexpr double degrees = 57.29577951308232; // 180/π

std::string utc_now()
{
    const auto now = std::chrono::system_clock::now();
    const std::time_t seconds = std::chrono::system_clock::to_time_t(now);
    std::tm parts{};
    gmtime_r(&seconds, &parts);
    char text[32];
    std::strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &parts);
    return text;
}

report rates_of(const std::array<double, 4>& ser, const std::array<double, 4>& ber)
{
    static constexpr const char* names[] = {"exact", "facing", "union", "nearest"};
    report all;
    for (std::size_t k = 0; k < 4; ++k) {
        report one = report::object();
        if (ser[k] > 0) // below the smallest double nothing can be said here
            one["ser"] = ser[k];
        if (ber[k] > 0)
            one["ber"] = ber[k];
        all[names[k]] = std::move(one);
    }
    return all;
}

std::array<const rung*, 4> in_order(const rates& r)
{
    return {&r.exact, &r.facing, &r.union_bound, &r.nearest};
}

report rates_of(const rates& r)
{
    std::array<double, 4> ser, ber;
    const auto rungs = in_order(r);
    for (std::size_t k = 0; k < 4; ++k) {
        ser[k] = rungs[k]->ser;
        ber[k] = rungs[k]->ber;
    }
    return rates_of(ser, ber);
}

report rates_of(const expected_errors& e)
{
    std::array<double, 4> ser, ber;
    for (std::size_t k = 0; k < 4; ++k) {
        ser[k] = static_cast<double>(e.symbol[k] / static_cast<long double>(e.symbols));
        ber[k] = static_cast<double>(e.bit[k] / static_cast<long double>(e.symbols));
    }
    return rates_of(ser, ber);
}

report lock_of(const lock_status& lock)
{
    report out;
    out["state"] = to_string(lock.state);
    if (lock.state == lock_state::searching || lock.state == lock_state::lost)
        return out; // nothing else is known
    out["delay"] = lock.delay;
    out["rotation_deg"] = lock.rotation_deg;
    out["mirrored"] = lock.mirrored;
    out["inverted"] = lock.inverted;
    out["frequency"] = lock.frequency;
    return out;
}

report seconds_of(const second_counts& s)
{
    report out;
    out["errored"] = s.errored();
    out["severely_errored"] = s.severely_errored();
    out["unavailable"] = s.unavailable();
    out["available"] = s.available();
    out["unmeasured"] = s.unmeasured();
    if (s.available() > 0) {
        const auto available = static_cast<double>(s.available());
        out["errored_ratio"] = static_cast<double>(s.errored()) / available;
        out["severely_errored_ratio"] = static_cast<double>(s.severely_errored()) / available;
    }
    return out;
}

report shortfall_of(const shortfall& s)
{
    report out;
    if (s.db)
        out["db"] = *s.db;
    if (s.low)
        out["db_low"] = *s.low;
    if (s.high)
        out["db_high"] = *s.high;
    return out;
}

void put_interval(report& out, const std::string& name, double rate, const interval& ends)
{
    out[name] = rate;
    if (ends.low)
        out[name + "_low"] = *ends.low;
    out[name + "_high"] = ends.high;
}

} // namespace

void expected_errors::add(const predictor& p, const rates& at_es_n0, double es_n0, const tally& counts)
{
    const auto rungs_in_order = in_order(at_es_n0);
    const auto n = static_cast<long double>(counts.symbols);
    for (std::size_t k = 0; k < rungs; ++k) {
        symbol[k] += n * rungs_in_order[k]->ser;
        bit[k] += n * rungs_in_order[k]->ber;
    }
    symbols += counts.symbols;
    const std::size_t m = counts.sent.size();
    for (std::size_t i = 0; i < m && !transitions.empty(); ++i) {
        if (counts.sent[i] == 0)
            continue;
        const auto row = p.transition_row(es_n0, i);
        for (std::size_t j = 0; j < m; ++j)
            transitions[i * m + j] += static_cast<double>(counts.sent[i]) * row[j];
    }
}

watch::reporting::reporting(const signal_set& set, watch_options options)
    : d_set(set), d_options(std::move(options)), d_predictor(set, std::make_shared<awgn>(), d_options.rule),
      d_curve(d_predictor), d_digest(sha256(settings().dump())), d_counts(set), d_waiting_counts(set)
{
    if (set.size() <= most_points_for_transitions)
        d_expected.transitions.assign(set.size() * set.size(), 0);
}

/// Keys in alphabetic order, no spaces, doubles by their shortest text: anyone can form the digest again.
nlohmann::json watch::reporting::settings() const
{
    nlohmann::json s;
    s["set"] = d_set.name();
    for (std::size_t i = 0; i < d_set.size(); ++i) {
        s["points"].push_back({d_set.points()[i].real(), d_set.points()[i].imag()});
        s["labels"].push_back(d_set.label_string(i));
        if (!d_set.uniform())
            s["priors"].push_back(d_set.priors()[i]);
    }
    s["pattern"] = d_options.pattern;
    s["law"] = d_predictor.channel().name();
    s["detector"] = d_predictor.rule() == detector::map ? "map" : "ml";
    s["decisions"] = d_options.receiver_decisions ? "receiver" : "own";
    s["confidence"] = d_options.confidence;
    s["window"] = d_options.window;
    if (d_options.symbol_rate > 0)
        s["symbol_rate"] = d_options.symbol_rate;
    return s;
}

interval watch::reporting::run_intervals::ser(std::uint64_t errors, std::uint64_t symbols) const
{
    return dispersion > 1 ? clumped_interval(errors, symbols, dispersion, confidence)
                          : binomial_interval(errors, symbols, confidence);
}

/*!
 * Bit errors are a sum of N clumps, N itself dispersed: Var = E[N]·(Var h + D·E[h]²), so that the dispersion
 * of the sum is Σh²/Σh + (D − 1)·h̄.
 */
interval watch::reporting::run_intervals::ber(const tally& counts) const
{
    double clumping = counts.bit_dispersion();
    if (counts.symbol_errors > 0)
        clumping += (dispersion - 1) * static_cast<double>(counts.bit_errors) /
                    static_cast<double>(counts.symbol_errors);
    else
        clumping = dispersion;
    return clumped_interval(counts.bit_errors, counts.bits, clumping, confidence);
}

const rates& watch::reporting::rates_at(double es_n0) const
{
    if (!d_last_rates || d_last_rates->first != es_n0)
        d_last_rates.emplace(es_n0, d_predictor.at(es_n0));
    return d_last_rates->second;
}

void watch::reporting::add_prediction(const window& w)
{
    d_waiting_counts.merge(w.counts);
    d_waiting_fit.merge(w.fit);
    if (!w.fit.solve(d_set))
        return;
    if (const auto fit = d_waiting_fit.solve(d_set)) {
        d_expected.add(d_predictor, rates_at(fit->es_n0), fit->es_n0, d_waiting_counts);
        d_waiting_counts = tally(d_set);
        d_waiting_fit = {};
    }
}

/// Over all judged symbols; what still waits is predicted at the gauge of the run, for this report alone.
std::optional<expected_errors> watch::reporting::prediction_of_run() const
{
    auto all = d_expected;
    if (d_waiting_counts.symbols > 0) {
        const auto fit = d_fit.solve(d_set);
        if (!fit)
            return std::nullopt;
        all.add(d_predictor, rates_at(fit->es_n0), fit->es_n0, d_waiting_counts);
    }
    if (all.symbols == 0)
        return std::nullopt;
    return all;
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

report watch::reporting::counts_and_gauge(const tally& counts,
                                          const std::optional<gauge_result>& fit,
                                          const run_intervals& ends) const
{
    report out;
    out["symbols"] = counts.symbols;
    out["symbol_errors"] = counts.symbol_errors;
    out["bits"] = counts.bits;
    out["bit_errors"] = counts.bit_errors;
    if (counts.symbols > 0) {
        const auto share = [](std::uint64_t k, std::uint64_t n) {
            return static_cast<double>(k) / static_cast<double>(n);
        };
        put_interval(out,
                     "ser",
                     share(counts.symbol_errors, counts.symbols),
                     ends.ser(counts.symbol_errors, counts.symbols));
        put_interval(out, "ber", share(counts.bit_errors, counts.bits), ends.ber(counts));
    }
    if (!fit)
        return out;
    const double g2 = std::norm(fit->gain), o2 = std::norm(fit->offset);
    out["es_n0_db"] = to_db(fit->es_n0);
    out["es_n0_db_se"] = fit->es_n0_db_se;
    out["eb_n0_db"] = to_db(fit->es_n0 / d_set.entropy_bits());
    out["gain_db"] = to_db(g2);
    out["phase_deg"] = std::arg(fit->gain) * degrees;
    if (o2 > 0) // relative to the received Es
        out["offset_db"] = to_db(o2 / (g2 * d_set.es()));
    out["evm_rms"] = fit->evm_rms;
    out["mer_db"] = fit->mer_db;
    return out;
}

report watch::reporting::transitions(const std::optional<expected_errors>& expected,
                                     std::uint64_t& unlisted) const
{
    auto all = d_counts.transitions.sorted();
    unlisted = 0;
    if (all.size() > most_transitions) {
        const auto cut = all.begin() + most_transitions;
        std::nth_element(all.begin(), cut, all.end(), [](const transition& a, const transition& b) {
            return a.count > b.count;
        });
        for (auto t = cut; t != all.end(); ++t)
            unlisted += t->count;
        all.erase(cut, all.end());
        std::sort(all.begin(), all.end(), [](const transition& a, const transition& b) {
            return a.from != b.from ? a.from < b.from : a.to < b.to;
        });
    }
    report rows = report::array();
    for (const auto& t : all) {
        report row = {t.from, t.to, t.count};
        if (expected && !expected->transitions.empty())
            row.push_back(expected->transitions[t.from * d_set.size() + t.to]);
        rows.push_back(std::move(row));
    }
    return rows;
}

report watch::reporting::total(const window& w,
                               const std::optional<gauge_result>& fit,
                               const run_intervals& ends) const
{
    report out = counts_and_gauge(d_counts, fit, ends);
    const auto in = d_counts.accounted() + w.pending;
    if (d_options.symbol_rate > 0)
        out["seconds"] = static_cast<double>(in) / d_options.symbol_rate;
    out["in"] = in;
    out["judged"] = d_counts.symbols;
    out["pending"] = w.pending;
    out["nonfinite"] = d_counts.nonfinite;
    out["excluded"] = {{"before_lock", d_counts.excluded[0]},
                       {"slip", d_counts.excluded[1]},
                       {"signal_lost", d_counts.excluded[2]},
                       {"overflow", d_counts.excluded[3]}};
    if (d_lock)
        out["slips"] = d_lock->slips;
    if (const auto d = w.blocks.dispersion())
        out["dispersion"] = *d;
    if (d_counts.bit_errors > 0)
        out["bit_dispersion"] = d_counts.bit_dispersion();
    const auto expected = prediction_of_run();
    if (expected)
        out["predicted"] = rates_of(*expected);
    out["by_bit"] = d_counts.by_bit;
    std::uint64_t unlisted = 0;
    out["transitions"] = transitions(expected, unlisted);
    if (unlisted > 0)
        out["transitions_unlisted"] = unlisted;
    return out;
}

report watch::reporting::report_of(window&& w, bool final)
{
    d_counts.merge(w.counts);
    d_fit.merge(w.fit);
    if (w.lock)
        d_lock = w.lock;
    if (w.input)
        d_input = w.input;
    add_prediction(w);
    add_stretch(w);
    add_input(w);
    const run_intervals ends{w.blocks.dispersion().value_or(1), d_options.confidence};

    report out;
    out["schema"] = "halfplane/report/1";
    out["version"] = HALFPLANE_VERSION;
    out["settings_sha256"] = d_digest;
    out["time"] = d_options.clock ? d_options.clock() : utc_now();
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

    const auto fit = w.fit.solve(d_set);
    report window_part = {{"first_symbol", w.first_symbol}};
    window_part.update(counts_and_gauge(w.counts, fit, ends));
    if (fit)
        window_part["predicted"] = rates_of(rates_at(fit->es_n0));
    out["window"] = std::move(window_part);
    out["total"] = total(w, d_fit.solve(d_set), ends);

    if (d_input) {
        out["input"] = {{"es_n0_db", d_input->es_n0_db},
                        {"es_n0_db_se", d_input->es_n0_db_se},
                        {"source", d_input->measured ? "measured" : "declared"}};
    }
    report shortfalls;
    for (const auto& [place, found] :
         {std::pair{"decision", at_decision(ends)}, std::pair{"input", at_input(ends)}})
        if (found)
            if (auto ends_found = shortfall_of(*found); !ends_found.empty())
                shortfalls[place] = std::move(ends_found);
    if (!shortfalls.empty())
        out["shortfall"] = std::move(shortfalls);
    if (d_lock)
        out["lock"] = lock_of(*d_lock);
    if (w.seconds.all() > 0)
        out["seconds"] = seconds_of(w.seconds);
    return out;
}

} // namespace halfplane::link
