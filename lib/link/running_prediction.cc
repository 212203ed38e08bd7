// SPDX-License-Identifier: GPL-3.0-or-later
// running_prediction: sums over windows.
#include "running_prediction.h"

namespace halfplane::link {

running_prediction::running_prediction(const signal_set& set, bool with_transitions) : d_waiting_counts(set)
{
    if (with_transitions)
        d_expected.transitions.assign(set.size() * set.size(), 0);
}

void running_prediction::add(const rate_memory& rates,
                             const signal_set& set,
                             const tally& counts,
                             const gauge& fit)
{
    d_waiting_counts.merge(counts);
    d_waiting_fit.merge(fit);
    if (!fit.solve(set))
        return;
    if (const auto found = d_waiting_fit.solve(set)) {
        d_expected.add(rates.source(), rates.at(found->es_n0), found->es_n0, d_waiting_counts);
        d_waiting_counts = tally(set);
        d_waiting_fit = {};
    }
}

std::optional<expected_errors>
running_prediction::of_run(const rate_memory& rates, const signal_set& set, const gauge& of_all) const
{
    auto all = d_expected;
    if (d_waiting_counts.symbols > 0) {
        const auto fit = of_all.solve(set);
        if (!fit)
            return std::nullopt;
        all.add(rates.source(), rates.at(fit->es_n0), fit->es_n0, d_waiting_counts);
    }
    if (all.symbols == 0)
        return std::nullopt;
    return all;
}

} // namespace halfplane::link
