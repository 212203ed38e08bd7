// SPDX-License-Identifier: GPL-3.0-or-later
// llr_stores: ratios from bit by bit to sample by sample. Included once for each target.
#pragma once

#include "llr_view.h"

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

namespace llr_detail {

constexpr std::size_t lanes = llr_view::lanes;

#if defined(__AVX512F__) && defined(__GNUC__) && !defined(__clang__)
#define HALFPLANE_WIDE_STORES 1

using floats = float __attribute__((vector_size(64)));
using doubles = double __attribute__((vector_size(64)));
using places = std::int64_t __attribute__((vector_size(64)));
using small_places = std::int32_t __attribute__((vector_size(64)));

inline floats row(const float* from)
{
    floats v;
    __builtin_memcpy(&v, from, sizeof v);
    return v;
}

inline void store(doubles v, float* out)
{
    __builtin_memcpy(out, &v, sizeof v);
}

/// a0 b0 a1 b1 …: the first half, and the second; a pair counts as one double from here on.
inline doubles low_pairs(floats a, floats b)
{
    return (doubles)__builtin_shuffle(
        a, b, small_places{0, 16, 1, 17, 2, 18, 3, 19, 4, 20, 5, 21, 6, 22, 7, 23});
}
inline doubles high_pairs(floats a, floats b)
{
    return (doubles)__builtin_shuffle(
        a, b, small_places{8, 24, 9, 25, 10, 26, 11, 27, 12, 28, 13, 29, 14, 30, 15, 31});
}
inline doubles low_quads(doubles a, doubles b)
{
    return __builtin_shuffle(a, b, places{0, 8, 1, 9, 2, 10, 3, 11});
}
inline doubles high_quads(doubles a, doubles b)
{
    return __builtin_shuffle(a, b, places{4, 12, 5, 13, 6, 14, 7, 15});
}

/// Pairs of eight samples, of the bits two by two.
template <unsigned bits>
inline void store_pairs(const doubles* pair, float* out)
{
    if constexpr (bits == 2) {
        store(pair[0], out);
    } else if constexpr (bits == 4) {
        store(low_quads(pair[0], pair[1]), out);
        store(high_quads(pair[0], pair[1]), out + 16);
    } else if constexpr (bits == 6) {
        // a0 b0 c0 a1 b1 c1 a2 b2, c2 a3 b3 …, … c7: first a and b, then c into its places.
        store(__builtin_shuffle(__builtin_shuffle(pair[0], pair[1], places{0, 8, 0, 1, 9, 0, 2, 10}),
                                pair[2],
                                places{0, 1, 8, 3, 4, 9, 6, 7}),
              out);
        store(__builtin_shuffle(__builtin_shuffle(pair[0], pair[1], places{0, 3, 11, 0, 4, 12, 0, 5}),
                                pair[2],
                                places{10, 1, 2, 11, 4, 5, 12, 7}),
              out + 16);
        store(__builtin_shuffle(__builtin_shuffle(pair[0], pair[1], places{13, 0, 6, 14, 0, 7, 15, 0}),
                                pair[2],
                                places{0, 13, 2, 3, 14, 5, 6, 15}),
              out + 32);
    } else {
        static_assert(bits == 8);
        const doubles a = low_quads(pair[0], pair[1]), b = low_quads(pair[2], pair[3]),
                      c = high_quads(pair[0], pair[1]), d = high_quads(pair[2], pair[3]);
        constexpr places first{0, 1, 8, 9, 2, 3, 10, 11}, second{4, 5, 12, 13, 6, 7, 14, 15};
        store(__builtin_shuffle(a, b, first), out);
        store(__builtin_shuffle(a, b, second), out + 16);
        store(__builtin_shuffle(c, d, first), out + 32);
        store(__builtin_shuffle(c, d, second), out + 48);
    }
}
#endif

/// Bit by bit to sample by sample, `bits` of them.
template <unsigned bits>
inline void interleave(const float (*ratio)[lanes], float* __restrict out)
{
#ifdef HALFPLANE_WIDE_STORES
    if constexpr (bits % 2 == 0) {
        doubles low[bits / 2], high[bits / 2];
        for (unsigned k = 0; k < bits / 2; ++k) {
            const floats a = row(ratio[2 * k]), b = row(ratio[2 * k + 1]);
            low[k] = low_pairs(a, b), high[k] = high_pairs(a, b);
        }
        store_pairs<bits>(low, out);
        store_pairs<bits>(high, out + 8 * bits);
        return;
    }
#endif
    for (std::size_t l = 0; l < lanes; ++l)
        for (unsigned k = 0; k < bits; ++k)
            out[l * bits + k] = ratio[k][l];
}

inline void write(const float (*ratio)[lanes], unsigned bits, std::size_t n, float* out)
{
    if (n == lanes)
        switch (bits) {
        case 2:
            return interleave<2>(ratio, out);
        case 3:
            return interleave<3>(ratio, out);
        case 4:
            return interleave<4>(ratio, out);
        case 6:
            return interleave<6>(ratio, out);
        case 8:
            return interleave<8>(ratio, out);
        default:
            break;
        }
    for (std::size_t l = 0; l < n; ++l)
        for (unsigned k = 0; k < bits; ++k)
            out[l * bits + k] = ratio[k][l];
}

} // namespace llr_detail

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
