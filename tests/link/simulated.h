// SPDX-License-Identifier: GPL-3.0-or-later
// A link in a test: seeded symbols and noise, and the count made offline by brute force.
#pragma once

#include "halfplane/kernels/detect.h"
#include "halfplane/kernels/noise.h"
#include "halfplane/rates.h"
#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"

#include <complex>
#include <cstdint>
#include <limits>
#include <random>
#include <vector>

namespace halfplane::testing {

struct simulated {
    std::vector<std::complex<float>> samples;
    std::vector<reference_t> reference;
};

/// `n` symbols by prior at this Es/N0.
inline simulated simulate(const signal_set& set, std::size_t n, double es_n0_db, std::uint64_t seed)
{
    simulated s;
    std::mt19937_64 random(seed);
    std::discrete_distribution<int> index(set.priors().begin(), set.priors().end());
    for (std::size_t k = 0; k < n; ++k) {
        s.reference.push_back(static_cast<reference_t>(set.uniform() ? static_cast<int>(random() % set.size())
                                                                     : index(random)));
        s.samples.emplace_back(set.points()[static_cast<std::size_t>(s.reference.back())]);
    }
    kernels::complex_noise(seed).add(0, n, set.es() / from_db(es_n0_db), s.samples.data());
    return s;
}

/// Every 97th symbol excluded by one of the causes, every 89th not a number.
inline void spoil(simulated& s)
{
    for (std::size_t k = 0; k < s.samples.size(); k += 97)
        s.reference[k] = static_cast<reference_t>(-1 - static_cast<int>(k / 97 % 4));
    for (std::size_t k = 0; k < s.samples.size(); k += 89)
        s.samples[k] = {std::numeric_limits<float>::quiet_NaN(), 0};
}

struct offline_count {
    std::uint64_t symbols = 0, symbol_errors = 0, bit_errors = 0, nonfinite = 0, excluded[4] = {};
};

/// Counted by the readable reference decision, symbol by symbol, over the first `n`.
inline offline_count count_offline(const signal_set& set, const simulated& s, std::size_t n)
{
    std::vector<std::uint16_t> decided(n);
    kernels::point_decider(set).decide_reference(s.samples.data(), decided.data(), n);
    offline_count c;
    for (std::size_t k = 0; k < n; ++k) {
        const auto sent = s.reference[k];
        if (sent < 0) {
            ++c.excluded[-1 - sent];
        } else if (decided[k] == kernels::point_decider::nonfinite) {
            ++c.nonfinite;
        } else {
            ++c.symbols;
            c.symbol_errors += sent != decided[k];
            c.bit_errors +=
                label_distance(set.labels()[static_cast<std::size_t>(sent)], set.labels()[decided[k]]);
        }
    }
    return c;
}

} // namespace halfplane::testing
