// SPDX-License-Identifier: GPL-3.0-or-later
// expected_errors: sums of predicted errors over windows.
#include "expected_errors.h"

namespace halfplane::link {

std::array<const rung*, 4> in_order(const rates& r)
{
    return {&r.exact, &r.facing, &r.union_bound, &r.nearest};
}

void expected_errors::add(const rates& at_es_n0, std::uint64_t count)
{
    const auto rungs_in_order = in_order(at_es_n0);
    const auto n = static_cast<long double>(count);
    for (std::size_t k = 0; k < rungs; ++k) {
        symbol[k] += n * rungs_in_order[k]->ser;
        bit[k] += n * rungs_in_order[k]->ber;
    }
    symbols += count;
}

void expected_errors::add(const predictor& p, const rates& at_es_n0, double es_n0, const tally& counts)
{
    add(at_es_n0, counts.symbols);
    const std::size_t m = counts.sent.size();
    for (std::size_t i = 0; i < m && !transitions.empty(); ++i) {
        if (counts.sent[i] == 0)
            continue;
        const auto row = p.transition_row(es_n0, i);
        for (std::size_t j = 0; j < m; ++j)
            transitions[i * m + j] += static_cast<double>(counts.sent[i]) * row[j];
    }
}

} // namespace halfplane::link
