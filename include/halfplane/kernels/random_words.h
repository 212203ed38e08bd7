// SPDX-License-Identifier: GPL-3.0-or-later
// random_words: seeded random bits by counter, for draws of symbols and of channel states.
#pragma once

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

/*!
 * Independent uniform 32-bit words; word k of (seed, stream) is a pure function of the three: word k % 4 of
 * the Philox4x32-10 block (see complex_noise) with counter k/4 and the stream. Streams of one seed are shared
 * with complex_noise: use another stream number for other purposes. k < 2^64.
 */
class random_words
{
public:
    explicit random_words(std::uint64_t seed, std::uint64_t stream = 0) : d_seed(seed), d_stream(stream) {}
    void draw(std::uint64_t first, std::size_t count, std::uint32_t* out) const;

private:
    std::uint64_t d_seed, d_stream;
};

} // namespace halfplane::kernels
