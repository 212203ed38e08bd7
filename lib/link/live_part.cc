// SPDX-License-Identifier: GPL-3.0-or-later
// live_part: blind gauges of windows and stretches.
#include "live_part.h"

#include "report_parts.h"

#include <cmath>

namespace halfplane::link {

void live_part::sums::add(const rate_memory& rates, const blind_result& fit, std::uint64_t symbols)
{
    const double n = static_cast<double>(symbols);
    expected.add(rates.at(fit.es_n0), symbols);
    sampled += fit.samples;
    db += n * to_db(fit.es_n0);
    variance += n * n * fit.es_n0_db_se * fit.es_n0_db_se;
}

void live_part::add(const rate_memory& rates,
                    const thinned_samples& of_window,
                    const std::optional<gauge_result>& known)
{
    d_window = report::object();
    if (of_window.seen() == 0)
        return;
    d_starts.clear();
    if (known)
        d_starts.push_back({known->gain, known->offset, known->n0});
    if (d_found)
        d_starts.push_back(d_latest);

    const auto fit = d_gauge.solve(of_window.kept(), d_starts);
    d_window["symbols"] = of_window.seen();
    d_window["sampled"] = of_window.kept().size();
    if (fit) {
        d_found = true;
        d_latest = {fit->gain, fit->offset, fit->n0};
        put_gauge(d_window, d_set, {fit->gain, fit->offset, fit->es_n0, fit->es_n0_db_se});
        d_window["predicted"] = rates_of(rates.at(fit->es_n0));
    }

    const bool alone = d_waiting.seen() == 0;
    d_waiting.merge(of_window);
    if (d_waiting.seen() < stretch_symbols)
        return;
    if (const auto of_all = alone ? fit : d_gauge.solve(d_waiting.kept(), d_starts)) {
        d_gauged.add(rates, *of_all, d_waiting.seen());
        d_waiting = {};
    }
}

report live_part::of_run(const rate_memory& rates, std::uint64_t symbols) const
{
    report out = report::object();
    if (symbols == 0)
        return out;
    auto all = d_gauged;
    if (d_waiting.seen() > 0)
        if (const auto rest = d_gauge.solve(d_waiting.kept(), d_starts))
            all.add(rates, *rest, d_waiting.seen());
    out["symbols"] = symbols;
    out["gauged"] = all.expected.symbols;
    out["sampled"] = all.sampled;
    if (all.expected.symbols > 0) {
        const double n = static_cast<double>(all.expected.symbols);
        out["es_n0_db"] = all.db / n;
        out["es_n0_db_se"] = std::sqrt(all.variance) / n;
        out["predicted"] = rates_of(all.expected);
    }
    return out;
}

} // namespace halfplane::link
