// SPDX-License-Identifier: GPL-3.0-or-later
// noise_loop: complex normals in blocks, each stage a loop that the compiler vectorises. Included once for
// each target.
#pragma once

#include "philox.h"

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

namespace noise_detail {

constexpr std::size_t block = 256; // samples

inline float as_float(std::uint32_t bits)
{
    float value;
    __builtin_memcpy(&value, &bits, sizeof value);
    return value;
}

inline std::uint32_t as_bits(float value)
{
    std::uint32_t bits;
    __builtin_memcpy(&bits, &value, sizeof bits);
    return bits;
}

/*!
 * −ln of a uniform number given as its distance t from the nearer end: u = t, or 1 − t where `from_one`.
 * Working from that end keeps the relative accuracy of small radii too. m in [0.75, 1.5) keeps the sum e·ln 2
 * + ln m free of cancellation. Polynomial: (ln(1 + f) − f + f²/2)/f³ over [−0.25, 0.5], own minimax fit
 * (Lawson's iteration against 50 digits), 5e-9 of the logarithm.
 */
inline float minus_log(float t, bool from_one)
{
    const float u = from_one ? 1.0f - t : t;
    const std::uint32_t bits = as_bits(u);
    const std::int32_t e = static_cast<std::int32_t>(bits - 0x3f400000u) >> 23;
    const float m = as_float(bits - (static_cast<std::uint32_t>(e) << 23));
    const bool near_one = from_one & (t <= 0.25f);
    const float f = near_one ? -t : m - 1.0f;
    float p = -0.045074816793203354f;
    p = p * f + 0.10463026165962219f;
    p = p * f - 0.13161195814609528f;
    p = p * f + 0.14478395879268646f;
    p = p * f - 0.1664731204509735f;
    p = p * f + 0.19990861415863037f;
    p = p * f - 0.2500009536743164f;
    p = p * f + 0.3333345055580139f;
    const float log_m = f + f * f * (f * p - 0.5f);
    return -(static_cast<float>(e) * 0.693147180559945f + log_m);
}

struct block_key {
    std::uint32_t s0, s1, k0, k1;
    block_key(std::uint64_t seed, std::uint64_t stream)
        : s0(static_cast<std::uint32_t>(stream)), s1(static_cast<std::uint32_t>(stream >> 32)),
          k0(static_cast<std::uint32_t>(seed)), k1(static_cast<std::uint32_t>(seed >> 32))
    {
    }
};

/// philox::block on scalars, in the form that the vectoriser takes.
inline void
philox_block(const block_key& key, std::uint32_t& c0, std::uint32_t& c1, std::uint32_t& c2, std::uint32_t& c3)
{
    c2 = key.s0, c3 = key.s1;
    std::uint32_t k0 = key.k0, k1 = key.k1;
#pragma GCC unroll 10
    for (int r = 0; r < philox::rounds; ++r) {
        const std::uint64_t p0 = std::uint64_t{philox::multiplier_0} * c0;
        const std::uint64_t p1 = std::uint64_t{philox::multiplier_1} * c2;
        c0 = static_cast<std::uint32_t>(p1 >> 32) ^ c1 ^ k0;
        c1 = static_cast<std::uint32_t>(p1);
        c2 = static_cast<std::uint32_t>(p0 >> 32) ^ c3 ^ k1;
        c3 = static_cast<std::uint32_t>(p0);
        k0 += philox::weyl_0, k1 += philox::weyl_1;
    }
}

/// 32 random bits a and b for each of n (even) samples from the even sample number `first` on.
inline void words(std::uint64_t seed,
                  std::uint64_t stream,
                  std::uint64_t first,
                  std::size_t n,
                  std::uint32_t* __restrict a,
                  std::uint32_t* __restrict b)
{
    const std::uint64_t pair = first / 2;
    const std::uint32_t low = static_cast<std::uint32_t>(pair), high = static_cast<std::uint32_t>(pair >> 32);
    const block_key key(seed, stream);
    for (std::size_t j = 0; j < n / 2; ++j) {
        std::uint32_t c0 = low + static_cast<std::uint32_t>(j);
        std::uint32_t c1 = high + (c0 < low ? 1u : 0u);
        std::uint32_t c2, c3;
        philox_block(key, c0, c1, c2, c3);
        a[2 * j] = c0, b[2 * j] = c1;
        a[2 * j + 1] = c2, b[2 * j + 1] = c3;
    }
}

/// The 32 further bits of a sample whose radius word began with twelve zeros.
inline std::uint32_t fine_word(std::uint64_t seed, std::uint64_t stream, std::uint64_t k)
{
    std::uint32_t c0 = static_cast<std::uint32_t>(k), c1 = static_cast<std::uint32_t>(k >> 32) | 0x80000000u,
                  c2, c3;
    philox_block(block_key(seed, stream), c0, c1, c2, c3);
    return c0;
}

/// CN(0, 1) samples from the even sample number `first` on, n ≤ block and even.
inline void unit_samples(
    std::uint64_t seed, std::uint64_t stream, std::uint64_t first, std::size_t n, float* __restrict z)
{
    alignas(64) std::uint32_t radius[block], angle[block];
    alignas(64) float t[block];
    words(seed, stream, first, n, radius, angle);

    std::uint32_t rare = 0;
    for (std::size_t k = 0; k < n; ++k) {
        const std::int32_t s = static_cast<std::int32_t>(radius[k]);
        t[k] = (static_cast<float>(s < 0 ? ~s : s) + 0.5f) * 0x1p-32f;
        rare |= radius[k] < (1u << 20) ? 1u : 0u;
    }
    if (rare)
        for (std::size_t k = 0; k < n; ++k)
            if (radius[k] < (1u << 20)) {
                const std::uint64_t u = (std::uint64_t{radius[k]} << 32) | fine_word(seed, stream, first + k);
                t[k] = (static_cast<float>(u) + 0.5f) * 0x1p-64f;
            }
    for (std::size_t k = 0; k < n; ++k) {
        const float r = __builtin_sqrtf(minus_log(t[k], static_cast<std::int32_t>(radius[k]) < 0));
        // The angle in quarter turns: a whole number and a rest in [−1/2, 1/2).
        const std::uint32_t quarter = (angle[k] + 0x20000000u) >> 30;
        const float x = static_cast<float>(static_cast<std::int32_t>(angle[k] - (quarter << 30))) *
                        (1.57079632679489662f * 0x1p-30f);
        const float xx = x * x;
        // Own minimax fits on [0, (π/4)²]: (sin x / x − 1)/x² to 4e-9, (cos x − 1 + x²/2)/x⁴ to 1e-10.
        const float sine =
            x +
            x * xx * (-0.16666655242443085f + xx * (0.008332177996635437f + xx * -0.00019517297914717346f));
        const float cosine =
            1.0f - 0.5f * xx +
            xx * xx * (0.04166664555668831f + xx * (-0.001388736767694354f + xx * 2.4438451873720624e-05f));
        const bool odd = quarter & 1;
        const std::uint32_t flip_re = ((quarter + 1) & 2) << 30, flip_im = (quarter & 2) << 30;
        z[2 * k] = r * as_float(as_bits(odd ? sine : cosine) ^ flip_re);
        z[2 * k + 1] = r * as_float(as_bits(odd ? cosine : sine) ^ flip_im);
    }
}

} // namespace noise_detail

void noise(std::uint64_t seed,
           std::uint64_t stream,
           std::uint64_t first,
           std::size_t count,
           float scale,
           bool add,
           float* out)
{
    using namespace noise_detail;
    alignas(64) float z[2 * block];
    while (count > 0) {
        const std::size_t skip = first & 1;
        const std::size_t n = count < block - skip ? count : block - skip;
        unit_samples(seed, stream, first - skip, (n + skip + 1) & ~std::size_t{1}, z);
        const float* from = z + 2 * skip;
        if (add)
            for (std::size_t k = 0; k < 2 * n; ++k)
                out[k] += scale * from[k];
        else
            for (std::size_t k = 0; k < 2 * n; ++k)
                out[k] = scale * from[k];
        out += 2 * n, first += n, count -= n;
    }
}

void random_words(
    std::uint64_t seed, std::uint64_t stream, std::uint64_t first, std::size_t count, std::uint32_t* out)
{
    using namespace noise_detail;
    const block_key key(seed, stream);
    alignas(64) std::uint32_t w[4 * block / 4];
    while (count > 0) {
        const std::size_t skip = first % 4;
        const std::size_t n = count < block - skip ? count : block - skip;
        const std::uint64_t counter = first / 4;
        const std::uint32_t low = static_cast<std::uint32_t>(counter);
        const std::uint32_t high = static_cast<std::uint32_t>(counter >> 32);
        for (std::size_t j = 0; j < block / 4; ++j) {
            std::uint32_t c0 = low + static_cast<std::uint32_t>(j);
            std::uint32_t c1 = high + (c0 < low ? 1u : 0u);
            std::uint32_t c2, c3;
            philox_block(key, c0, c1, c2, c3);
            w[4 * j] = c0, w[4 * j + 1] = c1, w[4 * j + 2] = c2, w[4 * j + 3] = c3;
        }
        __builtin_memcpy(out, w + skip, n * sizeof *out);
        out += n, first += n, count -= n;
    }
}

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
