// SPDX-License-Identifier: GPL-3.0-or-later
// gauge: gain, phase, offset, N0 and Es/N0 of a window by least squares over known symbols.
#pragma once

#include "halfplane/signal_set.h"

#include <complex>
#include <cstddef>
#include <cstdint>
#include <optional>
#include <vector>

namespace halfplane {

/// What least squares says of r_k = g·s_k + o + e_k.
struct gauge_result {
    complex gain;       ///< g
    complex offset;     ///< o
    double n0;          ///< Σ|e|²/(n − 2)
    double es_n0;       ///< γ = |g|²·Es/N0, linear, Es by the priors of the set
    double es_n0_db_se; ///< standard error in dB, 4.34·√(1/n + 2/(n·γ)); Gaussian noise assumed
    double evm_rms;     ///< √(Σ|e|²/Σ|g s|²), a ratio (normalisation of 3GPP TS 38.104)
    double mer_db;      ///< −20·log10(evm_rms) (ETSI TR 101 290)
    /*!
     * Σ over erroneous symbols of ψ, one symbol's influence on ln γ:
     * ψ = 2 Re[e (s − s̄)* / (g Q)] − (|e|²/N0 − 1), Q the mean of |s − s̄|² (first-order expansion of ln γ in
     * the noise). Cov(γ in dB, number of errors) = 4.34·error_influence/n: both come from the same noise.
     */
    double error_influence;
};

/*!
 * Sufficient sums of a stretch of known symbols: everything follows from them, so stretches merge exactly.
 *
 * Chunks of 1,024 are summed in double precision and added up in long double: with 64 bits of mantissa the
 * sums of 1e9 symbols of 20 dB under an offset as large as the signal keep N0 to 1e-9. A long double no wider
 * than a double (not on x86-64, nor on 64-bit ARM Linux) would lose about two digits of that.
 */
class gauge
{
public:
    /*!
     * \param received `n` finite samples
     * \param sent, decided `n` indices below points.size(): what was sent and what it was taken for
     * \param points   the set's points, the same in every call
     */
    void add(const std::complex<float>* received,
             const std::uint16_t* sent,
             const std::uint16_t* decided,
             std::size_t n,
             const std::vector<complex>& points);
    /// One symbol: the sample, the point that was sent, whether it was taken for another.
    void add(std::complex<float> received, complex sent, bool error);
    void merge(const gauge& later);
    std::uint64_t count() const noexcept { return d_all.n; }
    /// Nothing where fewer than 3 symbols came, one point only was sent, there is no gain, or the noise is
    /// below 1e-13 of the received energy, where sums over single-precision samples cannot tell it.
    std::optional<gauge_result> solve(const signal_set& set) const;
    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("all", d_all);
        a("errors", d_errors);
    }

private:
    struct sums {
        std::uint64_t n = 0;
        long double r_re = 0, r_im = 0;   // Σ r
        long double s_re = 0, s_im = 0;   // Σ s
        long double rs_re = 0, rs_im = 0; // Σ r·s*
        long double rr = 0, ss = 0;       // Σ|r|², Σ|s|²
        void merge(const sums& later);
        template <typename Archive>
        void carry(Archive& a)
        {
            a("n", n);
            a("r_re", r_re);
            a("r_im", r_im);
            a("s_re", s_re);
            a("s_im", s_im);
            a("rs_re", rs_re);
            a("rs_im", rs_im);
            a("rr", rr);
            a("ss", ss);
        }
    };
    sums d_all, d_errors;
};

} // namespace halfplane
