// SPDX-License-Identifier: GPL-3.0-or-later
// expected_errors: what errors the predictions expect, summed over windows.
#pragma once

#include "halfplane/rates.h"
#include "halfplane/tally.h"

#include <array>
#include <cstdint>
#include <vector>

namespace halfplane::link {

/// Exact, facing, union, nearest: the order in which rungs stand here and in the report.
std::array<const rung*, 4> in_order(const rates& r);

/// Σ n·rate over windows, by rung.
struct expected_errors {
    static constexpr std::size_t rungs = 4;
    std::array<long double, rungs> symbol{}, bit{}; ///< Σ n·SER, Σ n·BER
    std::uint64_t symbols = 0;                      ///< n: judged symbols spoken of
    std::vector<double> transitions;                ///< Σ n_i·P(j|i), row by row; empty for large sets

    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("symbol", symbol);
        a("bit", bit);
        a("symbols", symbols);
        a("transitions", transitions);
    }

    /// `n` symbols at these rates, no transitions.
    void add(const rates& at_es_n0, std::uint64_t n);
    void add(const predictor& p, const rates& at_es_n0, double es_n0, const tally& counts);
};

} // namespace halfplane::link
