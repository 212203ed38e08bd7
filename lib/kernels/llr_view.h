// SPDX-License-Identifier: GPL-3.0-or-later
// llr_view: what the loops of the soft detector read.
#pragma once

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

/*!
 * Points that differ in some of the label's bits, in ascending order of these bits. The metric of a sample is
 * x·re + y·im + constant, in nats.
 */
struct llr_part {
    const double *re, *im, *constant;
    const std::uint16_t* label;
    std::size_t size;
    unsigned bits;
    const std::uint16_t* missing; ///< labels that no point carries
    std::size_t missing_count;
    std::uint32_t has_zero, has_one; ///< bit k (0 the least significant) stands as 0, as 1, in some label
    const std::uint8_t* position;    ///< of bit k within a sample's ratios
    const std::uint16_t* place;      ///< by index in the set, the place in the arrays above
    bool near_is_enough;             ///< the nearest point's metric may stand in for the largest
    enum axis_kind { both, in_phase, quadrature };
    axis_kind axis; ///< the coordinate that metrics depend on; the other factor is 0
    /// Few enough points for all metrics to be kept: the largest is found on the way, no decision is wanted.
    static constexpr std::size_t most_kept = 16;
    bool few() const { return size <= most_kept; }
};

/*!
 * One part that is the whole set; or two, where points, labels and priors are a product of in-phase and
 * quadrature: the sums over one axis then cancel from the ratios of the other's bits, and √M + √M points do
 * for M.
 */
struct llr_view {
    static constexpr std::size_t lanes = 16; ///< samples that are worked on together
    llr_part part[2];
    unsigned parts;
    unsigned label_bits;
    bool exact;
    float sign, saturation;
    /// Whether the nearest point of each sample is wanted.
    bool wants_decisions() const
    {
        for (unsigned p = 0; p < parts; ++p)
            if (!part[p].few())
                return true;
        return false;
    }
    std::size_t scratch() const { return 2 * lanes << label_bits; } ///< floats
};

} // namespace halfplane::kernels
