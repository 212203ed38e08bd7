// SPDX-License-Identifier: GPL-3.0-or-later
// rates: the four rungs (nearest, facing, union, exact) of SER and BER, and their inverse.
#pragma once

#include "halfplane/law.h"
#include "halfplane/noise_shape.h"
#include "halfplane/signal_set.h"

#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace halfplane {

/// Relative errors promised of SER and BER, and proved in the tests down to 1e-290. Coordinates and Es/N0
/// count as exact: their own rounding moves ln P by up to 2·|ln P| times their relative error.
constexpr double rate_accuracy = 1e-12;        ///< equal priors or nearest point, AWGN
constexpr double map_rate_accuracy = 1e-11;    ///< MAP under unequal priors, AWGN
constexpr double fading_rate_accuracy = 1e-11; ///< fading laws, cells that stay
constexpr double impulsive_rate_accuracy = 1e-10;
constexpr double displaced_rate_accuracy = 1e-10; ///< displaced means, noise that is not circular
/// MAP under unequal priors with a continuous fade: a quadrature over the fade whose cells move with it.
constexpr double map_fading_rate_accuracy = 1e-8;
/// Absolute error of ln_ser and ln_ber where the rate is below 1e-290, down to exp(−5000).
constexpr double ln_rate_accuracy = 1e-9;

/// Decision rule: `automatic` is MAP where priors differ, nearest point (ML) otherwise.
enum class detector { automatic, map, ml };
enum class rung_name { exact, facing, union_bound, nearest };

detector parse_detector(const std::string& text); ///< "map", "ml", "automatic"
rung_name parse_rung(const std::string& text);    ///< "exact", "facing", "union", "nearest"
const char* to_string(rung_name r) noexcept;

/// One rung. Rates are probabilities (bounds may exceed 1); below the smallest double they are 0 and the
/// natural logarithms still hold.
struct rung {
    double ser = 0, ber = 0;
    double ln_ser = 0, ln_ber = 0;
    double ber_if_gray = 0; ///< ser / label_bits
};

struct exact_rung : rung {
    std::vector<double> ser_by_point; ///< 1 − P(i|i), by index, computed as a sum of wedges
    std::vector<double> ber_by_bit;   ///< by bit position, [0] the leftmost
};

struct rates {
    exact_rung exact;
    rung facing, union_bound, nearest;
};

/// Where a point arrives on average, which need not be where the detector expects it.
struct displaced_point {
    std::size_t sent; ///< index of the point sent
    complex mean;     ///< noiseless place of arrival, in the unit of the set's points, finite
    double weight;    ///< probability that this point is sent and arrives there, ≥ 0
};

/*!
 * Predicted error rates of one set under one law and detector. Keeps the decision cells, so that many Es/N0
 * values cost little. Const members may be called from several threads at once.
 *
 * Es/N0 is linear, finite and above 0 everywhere, else std::invalid_argument; an index beyond the set is
 * std::out_of_range.
 */
class predictor
{
public:
    /*!
     * \param channel not null
     * \param shape   covariance of the noise; circular unless given
     * \throws std::invalid_argument where the law allows no MAP decisions under unequal priors (says why), or
     *         where the covariance is not positive definite
     */
    explicit predictor(signal_set set,
                       std::shared_ptr<const law> channel = std::make_shared<awgn>(),
                       detector rule = detector::automatic,
                       noise_shape shape = {});
    ~predictor();
    predictor(predictor&&) noexcept;
    predictor& operator=(predictor&&) noexcept;

    const signal_set& set() const noexcept;
    const law& channel() const noexcept;
    /// `map` or `ml`, never `automatic`.
    detector rule() const noexcept;

    /// All rungs.
    rates at(double es_n0) const;
    /// One number, cheaper than at().
    double ser(double es_n0, rung_name r = rung_name::exact) const;
    double ber(double es_n0, rung_name r = rung_name::exact) const;
    double ln_ser(double es_n0, rung_name r = rung_name::exact) const;
    double ln_ber(double es_n0, rung_name r = rung_name::exact) const;

    /// P(j|i) for all j: M numbers that sum to 1, the diagonal too.
    std::vector<double> transition_row(double es_n0, std::size_t i) const;
    /// All rows one after the other: P(j|i) at [i·M + j].
    std::vector<double> transitions(double es_n0) const;
    /*!
     * Expected confusion counts: sent[i]·P(j|i) at [i·M + j].
     * \param sent how often each point was sent, M numbers. \throws std::invalid_argument otherwise
     */
    std::vector<double> expected_counts(double es_n0, const std::vector<std::uint64_t>& sent) const;

    /*!
     * Exact rates when point i arrives at means[i] (rotation, offset, compression, imbalance …) while the
     * detector stays as it is. Es/N0 is still that of the set.
     * \param means M finite places. \throws std::invalid_argument otherwise
     */
    exact_rung displaced(double es_n0, const std::vector<complex>& means) const;
    /// The same for any number of places a point, say one for each interfering neighbour. Weights sum to 1.
    exact_rung displaced_among(double es_n0, const std::vector<displaced_point>& arrivals) const;
    /// Its ln_ser alone, several times cheaper.
    double displaced_ln_ser(double es_n0, const std::vector<displaced_point>& arrivals) const;

    /// Indices that point i faces at this Es/N0, ascending. Under MAP a point without a cell faces all
    /// others.
    std::vector<std::size_t> facing(double es_n0, std::size_t i) const;

    /*!
     * Es/N0 (linear) beyond which the rung stays at or below the target: the largest crossing. To the
     * relative error 1e-12; for a BER that rises and falls within 0.25 dB a crossing may be missed. \param
     * target > 0, finite. \throws std::invalid_argument otherwise \returns nothing where the target is not
     * crossed between −60 dB and 200 dB
     */
    std::optional<double> es_n0_for_ser(double target, rung_name r = rung_name::exact) const;
    std::optional<double> es_n0_for_ber(double target, rung_name r = rung_name::exact) const;

    /*!
     * Steepness of a rung: decades a dB, d log10(P)/d(Es/N0 in dB); its inverse is the dB a decade costs.
     * Relative error 1e-8.
     */
    double ser_decades_per_db(double es_n0, rung_name r = rung_name::exact) const;
    double ber_decades_per_db(double es_n0, rung_name r = rung_name::exact) const;

private:
    struct impl;
    std::unique_ptr<impl> d;
};

double from_db(double db) noexcept;  ///< 10^(db/10)
double to_db(double ratio) noexcept; ///< 10·log10(ratio)

} // namespace halfplane
