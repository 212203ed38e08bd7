// SPDX-License-Identifier: GPL-3.0-or-later
// information: what a set carries at an Es/N0: mutual information and bit-metric decoding rate, for AWGN.
#pragma once

#include "halfplane/signal_set.h"

#include <optional>

namespace halfplane {

/// Largest error of both figures in bits (tests/core/information.cc prints what is reached).
inline constexpr double information_accuracy = 1e-9;

struct information {
    double mi;       ///< I(X;Y) in bits a symbol, 0 … H
    double bmd_rate; ///< H(X) − Σ_k H(B_k|Y), not clipped at 0 (Böcherer, Steiner, Schulte, IEEE Trans.
                     ///< Commun. 63 (2015) 4651)
};

/*!
 * Both figures at one Es/N0 over complex AWGN, priors as the set has them.
 * \param es_n0 linear, ≥ 0; 0 and +infinity give the limits
 * \throws std::invalid_argument for negative values and NaN
 */
information information_at(const signal_set& set, double es_n0);

/*!
 * Es/N0 (linear) at which I(X;Y) reaches `bits`, to 1e-9 relative where the curve is that steep.
 * \returns nothing where the set carries no more than `bits` at any Es/N0
 * \throws std::invalid_argument unless bits > 0
 */
std::optional<double> es_n0_for_information(const signal_set& set, double bits);

/// log2(1 + Es/N0): bits a symbol that no set can exceed.
double capacity(double es_n0);
/// The Es/N0 (linear) at which capacity() is `bits`: 2^bits − 1.
double es_n0_of_capacity(double bits);
/*!
 * Gap to capacity at this Es/N0 in dB: es_n0 over the Es/N0 at which capacity() is `bits`, the mutual
 * information or the bit-metric rate that a set has here. What a code for this set gives away against the
 * best set there is. \param es_n0 linear, > 0; bits > 0. \throws std::invalid_argument otherwise
 */
double capacity_gap_db(double es_n0, double bits);
/// 10·log10 of es_n0 over the Es/N0 at which log2(1 + Es/N0) = H: how far an uncoded set stands from Shannon.
double shannon_gap_db(const signal_set& set, double es_n0);

} // namespace halfplane
