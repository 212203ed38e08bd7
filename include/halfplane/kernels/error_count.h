// SPDX-License-Identifier: GPL-3.0-or-later
// error_count: compares two streams of indices or labels and counts where and in which bits they differ.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

/*!
 * Positions at which two streams differ, in ascending order.
 * \param where room for `count` positions
 * \returns how many there are
 */
std::size_t
find_errors(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t count, std::uint32_t* where);

/// Adds the occurrences of each value to `histogram`, which has `size` entries. Every index must be below
/// `size`.
void count_indices(const std::uint16_t* index, std::size_t count, std::uint64_t* histogram, std::size_t size);

/// What two streams of labels say about the bits. Several calls add up.
struct label_errors {
    std::uint64_t labels = 0;               ///< compared
    std::uint64_t wrong_labels = 0;         ///< that differ
    std::uint64_t wrong_bits = 0;           ///< Σh, h the bits in which a pair differs
    std::uint64_t wrong_bits_squared = 0;   ///< Σh²
    std::array<std::uint64_t, 16> by_bit{}; ///< by weight: [0] the least significant
};

/// Compares labels of up to 16 bits and adds to `to`.
void count_label_errors(const std::uint16_t* sent,
                        const std::uint16_t* decided,
                        std::size_t count,
                        label_errors& to);
/// The same for streams of bytes.
void count_label_errors(const std::uint8_t* sent,
                        const std::uint8_t* decided,
                        std::size_t count,
                        label_errors& to);

} // namespace halfplane::kernels
