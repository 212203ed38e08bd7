// SPDX-License-Identifier: GPL-3.0-or-later
// philox: the counter-based generator Philox4x32-10, the readable form.
#pragma once

#include <array>
#include <cstdint>

namespace halfplane::kernels {

/*!
 * Philox4x32 with ten rounds: J. K. Salmon, M. A. Moraes, R. O. Dror and D. E. Shaw, "Parallel random
 * numbers: as easy as 1, 2, 3", SC11, section 3.3 and table 2. A bijection of the 128-bit counter for each
 * 64-bit key; so any place of any stream is reached at once.
 */
struct philox {
    static constexpr std::uint32_t multiplier_0 = 0xD2511F53u, multiplier_1 = 0xCD9E8D57u;
    static constexpr std::uint32_t weyl_0 = 0x9E3779B9u, weyl_1 = 0xBB67AE85u;
    static constexpr int rounds = 10;

    static constexpr std::array<std::uint32_t, 4>
    block(std::array<std::uint32_t, 4> counter, std::uint32_t key_0, std::uint32_t key_1) noexcept
    {
        for (int r = 0; r < rounds; ++r) {
            const std::uint64_t p0 = std::uint64_t{multiplier_0} * counter[0];
            const std::uint64_t p1 = std::uint64_t{multiplier_1} * counter[2];
            counter = {static_cast<std::uint32_t>(p1 >> 32) ^ counter[1] ^ key_0,
                       static_cast<std::uint32_t>(p1),
                       static_cast<std::uint32_t>(p0 >> 32) ^ counter[3] ^ key_1,
                       static_cast<std::uint32_t>(p0)};
            key_0 += weyl_0, key_1 += weyl_1;
        }
        return counter;
    }
};

} // namespace halfplane::kernels
