// SPDX-License-Identifier: GPL-3.0-or-later
// shift_register: the pseudo-random bit sequences of ITU-T O.150, from any position on, and back from bits to
// position.
#pragma once

#include <cstdint>
#include <optional>
#include <unordered_map>
#include <vector>

namespace halfplane {

/// One sequence of the recommendation: feedback polynomial x^stages + x^tap + 1, and its output polarity.
struct o150_sequence {
    unsigned stages;
    unsigned tap;
    bool inverted; ///< the recommendation sends the complement of the register's output
};

/// The sequences known here, by ascending number of stages.
const std::vector<o150_sequence>& o150_sequences();

/*!
 * A binary shift register with feedback from stages `tap` and `stages`; its output a obeys
 *
 *     a_k = a_{k−tap} ⊕ a_{k−stages},
 *
 * taken from the last stage, so that the register's content *is* the next `stages` bits. Position 0 is the
 * register full of ones. Bits here are those of the register, before any inversion of the output.
 */
class shift_register
{
public:
    /// \param stages 2 … 32, \param tap 1 … stages − 1; the polynomial must be primitive for period() to hold
    shift_register(unsigned stages, unsigned tap);

    unsigned stages() const noexcept { return d_stages; }
    /// 2^stages − 1.
    std::uint64_t period() const noexcept { return d_mask; }

    /// The next `stages` bits, the first of them most significant.
    std::uint64_t content() const noexcept { return d_content; }
    /// Any content but zero, from which the register would never move.
    void set_content(std::uint64_t content) noexcept { d_content = content & d_mask; }

    /// Goes to bit `position` (taken modulo the period) in O(stages²) steps.
    void seek(std::uint64_t position) noexcept;

    /// The next `count` bits (0 … 32), the first of them most significant, and on by as many.
    std::uint32_t take(unsigned count) noexcept
    {
        std::uint64_t bits = 0;
        for (unsigned left = count; left > 0;) {
            // As many steps at once as the nearer tap allows.
            const unsigned width = left < d_tap ? left : d_tap;
            const std::uint64_t fed =
                ((d_content >> (d_tap - width)) ^ (d_content >> (d_stages - width))) & ((1ull << width) - 1);
            bits = bits << width | d_content >> (d_stages - width);
            d_content = (d_content << width | fed) & d_mask;
            left -= width;
        }
        return static_cast<std::uint32_t>(bits);
    }

private:
    std::uint64_t d_content, d_mask;
    unsigned d_stages, d_tap;
};

/*!
 * Finds where in its sequence a register stands: the discrete logarithm in GF(2^stages) by baby steps and
 * giant steps (D. Shanks, 1971), about 2·√period steps. The table is built once, 2^⌈stages/2⌉ entries.
 */
class register_locator
{
public:
    register_locator(unsigned stages, unsigned tap);
    /// Position 0 … period − 1 at which the next `stages` bits are `content`; nothing for zero.
    std::optional<std::uint64_t> position(std::uint64_t content) const;

private:
    unsigned d_stages;
    std::uint64_t d_period, d_stride;
    std::unordered_map<std::uint64_t, std::uint32_t>
        d_baby;                         ///< content → position, for positions below the stride
    std::vector<std::uint64_t> d_giant; ///< what `stride` steps make of each single bit
};

} // namespace halfplane
