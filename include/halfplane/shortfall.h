// SPDX-License-Identifier: GPL-3.0-or-later
// shortfall: the dB by which a run falls short of the exact curve, with an interval.
#pragma once

#include "halfplane/interval.h"
#include "halfplane/ser_curve.h"

#include <cstddef>
#include <cstdint>
#include <map>
#include <optional>

namespace halfplane {

/*!
 * How many symbols of a run came at which Es/N0. Stretches of the run are put into bins of Es/N0 that keep
 * count, mean and spread; a bin is 2^-20 dB wide at first, so that stretches stay apart, and all widths
 * double whenever there are more than `most_bins`. So memory is bounded and nothing is lost to second order,
 * however long the run.
 */
class snr_record
{
public:
    static constexpr std::size_t most_bins = 512;

    struct stretch {
        std::uint64_t symbols;
        double es_n0_db;
        double variance = 0;        ///< of es_n0_db, independent from stretch to stretch, dB²
        double error_influence = 0; ///< as in gauge_result
    };
    void add(const stretch& s);
    std::uint64_t symbols() const noexcept { return d_symbols; }

    /// Σ n_w·SER(γ_w − x) and what the interval needs, at a shift of x dB.
    struct expectation {
        double ln_errors;  ///< ln Σ n_w·SER(γ_w − x)
        double slope;      ///< d ln_errors / dx, positive
        double variance;   ///< of the shift, by the variances of the γ_w, dB²
        double covariance; ///< of the shift's γ part (dB) and the number of counted errors
    };
    expectation at(const ser_curve& curve, double shift_db) const;
    double lowest_db() const;
    double highest_db() const;
    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("bins", d_bins);
        a("width_exponent", d_width_exponent);
        a("symbols", d_symbols);
    }

private:
    struct bin {
        std::uint64_t symbols = 0;
        double mean = 0, squares = 0; // of es_n0_db: mean, Σ n (γ − mean)²
        double n_variance = 0;        // Σ n·variance
        double n2_variance = 0;       // Σ n²·variance
        double error_influence = 0;
        void merge(const bin& other);
        template <typename Archive>
        void carry(Archive& a)
        {
            a("symbols", symbols);
            a("mean", mean);
            a("squares", squares);
            a("n_variance", n_variance);
            a("n2_variance", n2_variance);
            a("error_influence", error_influence);
        }
    };
    std::map<long long, bin> d_bins;
    int d_width_exponent = -20; // bins are 2^this dB wide
    std::uint64_t d_symbols = 0;
};

/// Each end is absent where the data do not give it; see find_shortfall().
struct shortfall {
    std::optional<double> db, low, high;
};

struct shortfall_question {
    std::uint64_t errors;       ///< symbol errors counted over the record's symbols
    interval ser;               ///< of the measured SER; `high` one-sided where errors = 0
    double dispersion = 1;      ///< of error counts, ≥ 1; widens their variance
    double common_variance = 0; ///< dB², of an error of Es/N0 shared by the whole record
    double confidence = 0.95;   ///< of `ser` and of the result, in (0, 1)
};

/*!
 * Solves Σ_w n_w·SER(γ_w − x) = errors for the shift x in dB: positive where the link does worse than its
 * Es/N0 permits.
 *
 * Gauged γ_w scatter by their own error, and SER is convex in it: the part of the scatter that is error
 * (variance · (1 − n_w/n), about the record's mean) is taken back to second order. A single stretch gives γ −
 * γ(SER) exactly.
 *
 * Ends: with a the distance in x to the end that SER's interval gives, u = z·σ the part of the γ_w and ρ the
 * correlation of the two, half the width is √(a² + u² + 2ρ·a·u), each side by itself. ρ comes from the data
 * (gauge_result::error_influence) and is near −0.6, which makes the interval narrower than their quadrature.
 *
 * Without errors only `high` stands: x at SER's one-sided upper end, plus u one-sided. Where no Es/N0 from
 * −60 to 200 dB gives the measured rate (more errors than noise alone can make), `db` and `high` are absent
 * and `low`, if there is one, is x at SER's lower end minus u.
 */
shortfall find_shortfall(const snr_record& record, const ser_curve& curve, const shortfall_question& asked);

} // namespace halfplane
