// SPDX-License-Identifier: GPL-3.0-or-later
// rate_sums: all rungs as scaled sums, so that sums of rates far below the smallest double can be added up.
#pragma once

#include "halfplane/rates.h"

#include <vector>

namespace halfplane {

/// Which figures are asked for; others stay 0 and cost nothing.
enum rate_parts : unsigned {
    part_exact_ser = 1, ///< with exact.ser_by_point
    part_exact_ber = 2, ///< with exact.ber_by_bit
    part_facing = 4,
    part_union = 8,
    part_nearest = 16,
    part_all = 31,
};

struct ser_ber {
    double ser = 0, ber = 0;
};

struct rate_sums {
    double ln_scale = 0; ///< every figure is the number kept here times exp(ln_scale)
    ser_ber exact, facing, union_bound, nearest;
    std::vector<double> by_point, by_bit;

    const ser_ber& of(rung_name r) const;
    /// Sum of all figures; 0 where nothing has been added yet.
    double magnitude() const;
    /// True when no figure is more than `share` of the same figure of `sum`.
    bool negligible_beside(const rate_sums& sum, double share) const;
    /// The same with every rung's figures made positive.
    rate_sums absolute() const;
    /// The smallest figure that is not 0, including those by point and by bit.
    double least() const;
    /// Adds `weight` times the other figures, scales reconciled.
    void add(double weight, const rate_sums& other);
    rates finish(unsigned label_bits) const;
};

} // namespace halfplane
