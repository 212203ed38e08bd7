// SPDX-License-Identifier: GPL-3.0-or-later
// llr_view: what the loops of the soft detector read.
#pragma once

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

struct llr_view {
    static constexpr std::size_t lanes = 16; ///< samples that are worked on together

    // Points in ascending order of their labels; the metric of a sample is x·re + y·im + constant, in nats.
    const double *re, *im, *constant;
    const std::uint16_t* label;
    std::size_t size;
    unsigned label_bits;
    const std::uint16_t* missing; ///< labels that no point carries
    std::size_t missing_count;
    std::uint32_t has_zero, has_one; ///< bit k (0 the least significant) stands as 0, as 1, in some label
    bool exact;
    float sign, saturation;
    const std::uint16_t* place; ///< by index in the set, the place in the arrays above
    bool near_is_enough;        ///< the nearest point's metric may stand in for the largest
    std::size_t scratch() const { return 2 * lanes << label_bits; } ///< floats
};

} // namespace halfplane::kernels
