// SPDX-License-Identifier: GPL-3.0-or-later
// gauge: gain, phase, offset, N0 and Es/N0 of a window by least squares over known symbols.
#pragma once

#include "halfplane/signal_set.h"

#include <complex>
#include <cstddef>
#include <cstdint>
#include <optional>

namespace halfplane {

/// What least squares says of r_k = g·s_k + o + e_k.
struct gauge_result {
    complex gain;        ///< g
    complex offset;      ///< o
    double n0;           ///< Σ|e|²/(n − 2)
    double es_n0;        ///< |g|²·Es/N0, linear, Es by the priors of the set
    double es_n0_db_se;  ///< standard error in dB, 4.34·√(1/n + 2/(n·γ))
    double evm_rms;      ///< √(Σ|e|²/Σ|g s|²), a ratio (normalisation of 3GPP TS 38.104)
    double mer_db;       ///< −20·log10(evm_rms) (ETSI TR 101 290)
};

/*!
 * Sufficient sums of a window. add() is the hot loop's work; everything else follows from the sums, so windows
 * merge exactly. The sums over erroneous symbols alone give the covariance of error rate and N0, which come
 * from the same noise.
 */
class gauge
{
public:
    void add(std::complex<float> received, complex sent, bool error);
    void merge(const gauge& later);
    std::uint64_t count() const noexcept { return d_n; }
    /// Nothing where fewer than 3 symbols, one point only was sent, or no noise can be told.
    std::optional<gauge_result> solve(const signal_set& set) const;
    /// Sample covariance, a symbol, of the error indicator and |e|²/N0 (dimensionless). 0 where unknown.
    double error_noise_covariance(const signal_set& set) const;

private:
    struct sums {
        std::uint64_t n = 0;
        complex r{}, s{}, rs{}; // Σr, Σs, Σ r·s*
        double rr = 0, ss = 0;  // Σ|r|², Σ|s|²
    };
    std::uint64_t d_n = 0;
    sums d_all, d_errors;
};

} // namespace halfplane
