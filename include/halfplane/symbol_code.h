// SPDX-License-Identifier: GPL-3.0-or-later
// symbol_code: what stands in a stream of reference indices where there is no reference, and why.
#pragma once

#include <cstdint>

namespace halfplane {

/*!
 * A reference stream carries one int16 a symbol: 0 … M−1 is the index that was sent; a negative value says
 * that the symbol is excluded and why. So the account of what was left out travels with the samples
 * themselves and adds up to the symbol.
 */
using reference_t = std::int16_t;

enum class exclusion : reference_t {
    before_lock = -1, ///< the pattern had not been found yet
    slip = -2,        ///< symbols were lost or doubled here, the delay changed
    signal_lost = -3, ///< no signal, or a doubt that outlasted the hold-back
    overflow = -4,    ///< the radio said that samples are missing
};
constexpr int exclusion_count = 4;

/*!
 * Live traffic: nobody knows what was sent. Such a symbol is neither judged nor excluded; it is gauged
 * blindly. Not an exclusion, so it stands behind those.
 */
constexpr reference_t live_code = -1 - exclusion_count;

/*!
 * Added to an index that is known only because the receiver decoded it well (a frame encoded anew after its
 * checksum held). Frames that failed are missing among these, so they flatter: they are counted apart from
 * what was known in advance. A set has at most 4,096 points, so the bit is free.
 */
constexpr reference_t decoded_flag = 0x1000;

constexpr reference_t code(exclusion e) noexcept
{
    return static_cast<reference_t>(e);
}

} // namespace halfplane
