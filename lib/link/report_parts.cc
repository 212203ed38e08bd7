// SPDX-License-Identifier: GPL-3.0-or-later
// report_parts: pure conversions from measured things to parts of the report.
#include "report_parts.h"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <ctime>

namespace halfplane::link {

namespace {

constexpr double degrees = 57.29577951308232; // 180/π

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

} // namespace

void put_interval(report& out, const std::string& name, double rate, const interval& ends)
{
    out[name] = rate;
    if (ends.low)
        out[name + "_low"] = *ends.low;
    out[name + "_high"] = ends.high;
}

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

interval run_intervals::ser(std::uint64_t errors, std::uint64_t symbols) const
{
    return dispersion > 1 ? clumped_interval(errors, symbols, dispersion, confidence)
                          : binomial_interval(errors, symbols, confidence);
}

/*!
 * Bit errors are a sum of N clumps, N itself dispersed: Var = E[N]·(Var h + D·E[h]²), so that the dispersion
 * of the sum is Σh²/Σh + (D − 1)·h̄.
 */
interval run_intervals::ber(const tally& counts) const
{
    double clumping = counts.bit_dispersion();
    if (counts.symbol_errors > 0)
        clumping += (dispersion - 1) * static_cast<double>(counts.bit_errors) /
                    static_cast<double>(counts.symbol_errors);
    else
        clumping = dispersion;
    return clumped_interval(counts.bit_errors, counts.bits, clumping, confidence);
}

interval run_intervals::fer(std::uint64_t errors, std::uint64_t frames) const
{
    return frame_dispersion > 1 ? clumped_interval(errors, frames, frame_dispersion, confidence)
                                : binomial_interval(errors, frames, confidence);
}

/// Keys in alphabetic order, no spaces, doubles by their shortest text: anyone can form the digest again.
nlohmann::json settings_of(const signal_set& set, const predictor& p, const watch_options& options)
{
    nlohmann::json s;
    s["set"] = set.name();
    for (std::size_t i = 0; i < set.size(); ++i) {
        s["points"].push_back({set.points()[i].real(), set.points()[i].imag()});
        s["labels"].push_back(set.label_string(i));
        if (!set.uniform())
            s["priors"].push_back(set.priors()[i]);
    }
    s["pattern"] = options.pattern;
    s["law"] = p.channel().name();
    s["detector"] = p.rule() == detector::map ? "map" : "ml";
    s["decisions"] = options.receiver_decisions ? "receiver" : "own";
    s["confidence"] = options.confidence;
    s["window"] = options.window;
    if (options.symbol_rate > 0)
        s["symbol_rate"] = options.symbol_rate;
    if (!options.explain)
        s["explain"] = false;
    const auto& trial = options.trial;
    if (trial.frame_symbols > 0)
        s["frame_symbols"] = trial.frame_symbols;
    if (!trial.target.empty()) {
        s["target"] = trial.target;
        s["max_excluded"] = trial.max_excluded;
        if (trial.dependence > 0)
            s["dependence"] = trial.dependence;
    }
    return s;
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

report account_of(const tally& counts, std::uint64_t pending)
{
    report out;
    out["in"] = counts.accounted() + pending;
    out["judged"] = counts.symbols;
    if (counts.decoded > 0)
        out["decoded"] = counts.decoded;
    if (counts.live > 0)
        out["live"] = counts.live;
    out["pending"] = pending;
    out["nonfinite"] = counts.nonfinite;
    out["excluded"] = {{"before_lock", counts.excluded[0]},
                       {"slip", counts.excluded[1]},
                       {"signal_lost", counts.excluded[2]},
                       {"overflow", counts.excluded[3]}};
    return out;
}

report input_of(const input_snr& input)
{
    return {{"es_n0_db", input.es_n0_db},
            {"es_n0_db_se", input.es_n0_db_se},
            {"source", input.measured ? "measured" : "declared"}};
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

report losses_of(const std::vector<loss>& losses)
{
    report rows = report::array();
    for (const auto& found : losses) {
        report row = {{"cause", to_string(found.what)}};
        if (found.power_db)
            row["power_db"] = *found.power_db;
        row["cost_db"] = found.cost_db;
        rows.push_back(std::move(row));
    }
    return rows;
}

report premises_of(const std::vector<premise>& premises)
{
    report rows = report::array();
    for (const auto& tested : premises) {
        report row = {{"name", tested.name}};
        if (tested.p)
            row["p"] = *tested.p;
        if (tested.effect_db)
            row["effect_db"] = *tested.effect_db;
        row["state"] = to_string(tested.state);
        rows.push_back(std::move(row));
    }
    return rows;
}

report failing_of(const std::vector<premise>& premises)
{
    report names = report::array();
    for (const auto& tested : premises)
        if (tested.state == premise_state::fails)
            names.push_back(tested.name);
    return names;
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

void put_gauge(report& out, const signal_set& set, const gauged& fit)
{
    const double g2 = std::norm(fit.gain), o2 = std::norm(fit.offset);
    out["es_n0_db"] = to_db(fit.es_n0);
    out["es_n0_db_se"] = fit.es_n0_db_se;
    out["eb_n0_db"] = to_db(fit.es_n0 / set.entropy_bits());
    out["gain_db"] = to_db(g2);
    out["phase_deg"] = std::arg(fit.gain) * degrees;
    if (o2 > 0) // relative to the received Es
        out["offset_db"] = to_db(o2 / (g2 * set.es()));
}

report counts_and_gauge(const signal_set& set,
                        const tally& counts,
                        const std::optional<gauge_result>& fit,
                        const run_intervals& ends)
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
    put_gauge(out, set, {fit->gain, fit->offset, fit->es_n0, fit->es_n0_db_se});
    out["evm_rms"] = fit->evm_rms;
    out["mer_db"] = fit->mer_db;
    return out;
}

report frames_of(const trial_state& now, const frame_counts& before, const run_intervals& ends)
{
    report out = report::object();
    if (now.frames.length() == 0)
        return out;
    const auto frames = now.frames.frames - before.frames,
               errors = now.frames.frame_errors - before.frame_errors;
    out["frames"] = frames;
    out["frame_errors"] = errors;
    if (frames > 0)
        put_interval(
            out, "fer", static_cast<double>(errors) / static_cast<double>(frames), ends.fer(errors, frames));
    static constexpr const char* causes[] = {
        "before_lock", "slip", "signal_lost", "overflow", "nonfinite", "live"};
    for (std::size_t k = 0; k < frame_counts::causes; ++k)
        if (k != trial::live || now.frames.excluded[k] > 0) // most links have none
            out["frames_excluded"][causes[k]] = now.frames.excluded[k] - before.excluded[k];
    return out;
}

report verdict_of(const error_target& target,
                  const verdict& bets,
                  std::uint64_t excluded,
                  std::uint64_t frame_length)
{
    const auto now = bets.look(excluded);
    report out = {{"target", {{to_string(target.kind), target.rate}}}, {"state", to_string(now.state)}};
    if (now.log_wealth_pass)
        out["log_wealth_pass"] = *now.log_wealth_pass;
    if (now.log_wealth_fail)
        out["log_wealth_fail"] = *now.log_wealth_fail;
    if (now.block > 0)
        out["block"] = now.block;
    if (const auto all = bets.steps() + excluded; all > 0)
        out["excluded_share"] = static_cast<double>(excluded) / static_cast<double>(all);
    if (const auto steps = bets.steps_to_go(excluded))
        out["symbols_to_go"] = target.kind == error_kind::fer ? *steps * frame_length : *steps;
    return out;
}

report verdict_of(const trial_state& trial, const tally& counts)
{
    const auto before_lock = static_cast<std::size_t>(-1 - code(exclusion::before_lock));
    const auto excluded = trial.target->kind == error_kind::fer
                              ? trial.frames.all_excluded() - trial.frames.excluded[link::trial::live]
                              : counts.accounted() - counts.symbols - counts.excluded[before_lock] -
                                    counts.live - counts.decoded;
    return verdict_of(*trial.target, *trial.bets, excluded, trial.frames.length());
}

report transitions_of(const transition_counts& counted,
                      const std::vector<double>& expected,
                      std::size_t set_size,
                      std::uint64_t& unlisted)
{
    auto all = counted.sorted();
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
        if (!expected.empty())
            row.push_back(expected[t.from * set_size + t.to]);
        rows.push_back(std::move(row));
    }
    return rows;
}

} // namespace halfplane::link
