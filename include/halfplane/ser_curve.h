// SPDX-License-Identifier: GPL-3.0-or-later
// ser_curve: the exact symbol error rate over Es/N0 in dB, with slopes, at the price of a polynomial.
#pragma once

#include "halfplane/rates.h"

#include <array>
#include <cstddef>
#include <map>

namespace halfplane {

/*!
 * ln SER of one predictor's exact rung, interpolated by Chebyshev polynomials of degree 11 on panels of 1 dB
 * that are made when first asked for: 12 evaluations a panel, whatever the number of questions. For sets
 * under nearest-point decisions the relative error of SER is below `accuracy` · max(1, |ln SER|); under MAP,
 * where a cell appears or vanishes within a panel, the slope has a kink and 1e-6 is typical. Not thread-safe:
 * it learns while asked.
 */
class ser_curve
{
public:
    static constexpr double lowest_db = -60, highest_db = 200;
    static constexpr double accuracy = 1e-12;

    /// Refers to the predictor, which must outlive the curve.
    explicit ser_curve(const predictor& source) : d_source(source) {}

    struct value {
        double ln_ser;
        double slope;     ///< d ln SER / d dB, negative
        double curvature; ///< d² ln SER / d dB²
    };
    /// At an Es/N0 in dB, taken to the nearer end outside [lowest_db, highest_db].
    value at(double es_n0_db) const;

private:
    static constexpr std::size_t nodes = 12;
    using panel = std::array<double, nodes>;
    const panel& coefficients(int floor_db) const;

    const predictor& d_source;
    mutable std::map<int, panel> d_panels;
};

} // namespace halfplane
