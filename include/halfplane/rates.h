// SPDX-License-Identifier: GPL-3.0-or-later
// rates: the four rungs (nearest, facing, union, exact) of SER and BER, and their inverse.
#pragma once

#include "halfplane/law.h"
#include "halfplane/signal_set.h"

#include <cstddef>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace halfplane {

/// Decision rule: `automatic` is MAP where priors differ, nearest point (ML) otherwise.
enum class detector { automatic, map, ml };
enum class rung_name { exact, facing, union_bound, nearest };

detector parse_detector(const std::string& text);  ///< "map", "ml", "automatic"
rung_name parse_rung(const std::string& text);     ///< "exact", "facing", "union", "nearest"
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

/*!
 * Predicted error rates of one set under one law and detector. Keeps the decision cells, so that many Es/N0
 * values cost little. Const members may be called from several threads at once.
 */
class predictor
{
public:
    explicit predictor(signal_set set,
                       std::shared_ptr<const law> channel = std::make_shared<awgn>(),
                       detector rule = detector::automatic);
    ~predictor();
    predictor(predictor&&) noexcept;
    predictor& operator=(predictor&&) noexcept;

    const signal_set& set() const noexcept;
    const law& channel() const noexcept;
    /// `map` or `ml`, never `automatic`.
    detector rule() const noexcept;

    /// All rungs at Es/N0 (linear, finite, > 0). \throws std::invalid_argument otherwise
    rates at(double es_n0) const;
    /// One number, cheaper than at().
    double ser(double es_n0, rung_name r = rung_name::exact) const;
    double ber(double es_n0, rung_name r = rung_name::exact) const;
    double ln_ser(double es_n0, rung_name r = rung_name::exact) const;
    double ln_ber(double es_n0, rung_name r = rung_name::exact) const;

    /// P(j|i) for all j: M numbers that sum to 1, the diagonal too.
    std::vector<double> transition_row(double es_n0, std::size_t i) const;

    /// Indices that point i faces at this Es/N0, ascending.
    std::vector<std::size_t> facing(double es_n0, std::size_t i) const;

    /*!
     * Es/N0 (linear) beyond which the rung stays at or below the target: the largest crossing.
     * \returns nothing where the target cannot be reached between −60 dB and 200 dB
     */
    std::optional<double> es_n0_for_ser(double target, rung_name r = rung_name::exact) const;
    std::optional<double> es_n0_for_ber(double target, rung_name r = rung_name::exact) const;

private:
    struct impl;
    std::unique_ptr<impl> d;
};

double from_db(double db) noexcept; ///< 10^(db/10)
double to_db(double ratio) noexcept; ///< 10·log10(ratio)

} // namespace halfplane
