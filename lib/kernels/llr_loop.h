// SPDX-License-Identifier: GPL-3.0-or-later
// llr_loop: log-likelihood ratios, sixteen samples abreast. Included once for each target.
#pragma once

#include "llr_view.h"
#include "noise_loop.h"

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

namespace llr_detail {

constexpr std::size_t lanes = llr_view::lanes;
constexpr float floor_of_exp = -87.0f; // e^x is still a normal float
constexpr float small_sum = 1e-26f;    // below, terms that were cut at the floor may matter
constexpr float absent = -1e30f;       // metric of a label that no point carries

/// e^x for x ≤ 88; taken as e^−87 below the floor. Taylor to the fifth power on ±ln 2 / 2: 3e-6 relative.
inline float exp_of(float x)
{
    x = x > floor_of_exp ? x : floor_of_exp;
    const float shifted =
        x * 1.44269504088896341f + 12582912.0f; // 1.5·2^23: the integer part in the low bits
    const float whole = shifted - 12582912.0f;
    const float f = x - whole * 0.693147180559945f;
    float p = 1.0f / 120;
    p = p * f + 1.0f / 24;
    p = p * f + 1.0f / 6;
    p = p * f + 0.5f;
    p = p * f + 1.0f;
    p = p * f + 1.0f;
    return noise_detail::as_float(noise_detail::as_bits(p) + (noise_detail::as_bits(shifted) << 23));
}

inline float log_of(float x)
{
    return -noise_detail::minus_log(x, false);
}

inline float larger(float a, float b)
{
    return a > b ? a : b;
}

/// Metrics of all points less a common reference for each sample, in float.
inline void metrics(const llr_view& v,
                    const double* x,
                    const double* y,
                    const std::uint16_t* decided,
                    float* __restrict difference)
{
    double reference[lanes];
    if (v.near_is_enough)
        for (std::size_t l = 0; l < lanes; ++l) {
            const std::size_t i = v.place[decided[l]];
            reference[l] = x[l] * v.re[i] + y[l] * v.im[i] + v.constant[i];
        }
    else {
        for (std::size_t l = 0; l < lanes; ++l)
            reference[l] = x[l] * v.re[0] + y[l] * v.im[0] + v.constant[0];
        for (std::size_t i = 1; i < v.size; ++i)
            for (std::size_t l = 0; l < lanes; ++l) {
                const double m = x[l] * v.re[i] + y[l] * v.im[i] + v.constant[i];
                reference[l] = m > reference[l] ? m : reference[l];
            }
    }
    for (std::size_t i = 0; i < v.size; ++i) {
        const double re = v.re[i], im = v.im[i], constant = v.constant[i];
        float* row = difference + i * lanes;
        for (std::size_t l = 0; l < lanes; ++l) {
            const double d = x[l] * re + y[l] * im + constant - reference[l];
            row[l] = static_cast<float>(d > absent ? d : static_cast<double>(absent));
        }
    }
}

/// One bit again, each side around its own largest term.
inline void ratio_of_rare(const llr_view& v, const float* difference, unsigned bit, float* ratio)
{
    float best[2][lanes], sum[2][lanes];
    for (std::size_t l = 0; l < lanes; ++l) {
        best[0][l] = best[1][l] = 2 * absent;
        sum[0][l] = sum[1][l] = 0;
    }
    for (std::size_t i = 0; i < v.size; ++i) {
        float* top = best[v.label[i] >> bit & 1];
        for (std::size_t l = 0; l < lanes; ++l)
            top[l] = larger(top[l], difference[i * lanes + l]);
    }
    for (std::size_t i = 0; i < v.size; ++i) {
        const unsigned side = v.label[i] >> bit & 1;
        for (std::size_t l = 0; l < lanes; ++l)
            sum[side][l] += exp_of(difference[i * lanes + l] - best[side][l]);
    }
    for (std::size_t l = 0; l < lanes; ++l)
        ratio[l] = best[0][l] - best[1][l] + (log_of(sum[0][l]) - log_of(sum[1][l]));
}

/*!
 * Ratios of all bits from one value a label: the top bit splits the rows in halves; combining these halves
 * row by row leaves a table for the bits below. Three operations a pair of rows, 3·2^b in all, instead of
 * b·2^b.
 */
template <bool Exact>
void ratios(const llr_view& v,
            float* __restrict value,
            const float* __restrict difference,
            float (*ratio)[lanes])
{
    for (unsigned bit = v.label_bits; bit-- > 0;) {
        const std::size_t half = std::size_t{1} << bit;
        float zero[lanes], one[lanes];
        for (std::size_t l = 0; l < lanes; ++l)
            zero[l] = one[l] = Exact ? 0.0f : 2 * absent;
        for (std::size_t j = 0; j < half; ++j) {
            float* low = value + j * lanes;
            const float* high = value + (j + half) * lanes;
            for (std::size_t l = 0; l < lanes; ++l) {
                const float a = low[l], b = high[l];
                zero[l] = Exact ? zero[l] + a : larger(zero[l], a);
                one[l] = Exact ? one[l] + b : larger(one[l], b);
                low[l] = Exact ? a + b : larger(a, b);
            }
        }
        float* out = ratio[bit];
        if (!(v.has_zero >> bit & 1) || !(v.has_one >> bit & 1)) {
            for (std::size_t l = 0; l < lanes; ++l)
                out[l] = v.has_zero >> bit & 1 ? v.saturation : -v.saturation;
        } else if (!Exact) {
            for (std::size_t l = 0; l < lanes; ++l)
                out[l] = zero[l] - one[l];
        } else {
            bool rare = false;
            for (std::size_t l = 0; l < lanes; ++l)
                rare |= (zero[l] < small_sum) | (one[l] < small_sum);
            float again[lanes] = {};
            if (rare)
                ratio_of_rare(v, difference, bit, again);
            // Each lane by its own sums, so that a sample's ratios do not depend on its neighbours.
            for (std::size_t l = 0; l < lanes; ++l) {
                const bool small = (zero[l] < small_sum) | (one[l] < small_sum);
                out[l] = small ? again[l] : log_of(zero[l]) - log_of(one[l]);
            }
        }
    }
}

} // namespace llr_detail

void llr(const llr_view& v,
         const float* in,
         const std::uint16_t* decided,
         float* out,
         std::size_t count,
         float* scratch)
{
    using namespace llr_detail;
    const std::size_t labels = std::size_t{1} << v.label_bits;
    float *value = scratch, *difference = scratch + labels * lanes;
    float ratio[16][lanes];
    while (count > 0) {
        const std::size_t n = count < lanes ? count : lanes;
        double x[lanes] = {}, y[lanes] = {};
        float speaks[lanes] = {};
        std::uint16_t near[lanes] = {};
        for (std::size_t l = 0; l < n; ++l) {
            const bool finite = decided[l] != 0xffff;
            x[l] = finite ? static_cast<double>(in[2 * l]) : 0;
            y[l] = finite ? static_cast<double>(in[2 * l + 1]) : 0;
            near[l] = finite ? decided[l] : static_cast<std::uint16_t>(0);
            speaks[l] = finite ? v.sign : 0.0f;
        }
        metrics(v, x, y, near, difference);
        for (std::size_t i = 0; i < v.size; ++i) {
            const float* from = difference + i * lanes;
            float* to = value + v.label[i] * lanes;
            if (v.exact)
                for (std::size_t l = 0; l < lanes; ++l)
                    to[l] = exp_of(from[l]);
            else
                for (std::size_t l = 0; l < lanes; ++l)
                    to[l] = from[l];
        }
        for (std::size_t m = 0; m < v.missing_count; ++m)
            for (std::size_t l = 0; l < lanes; ++l)
                value[v.missing[m] * lanes + l] = v.exact ? 0.0f : 2 * absent;
        if (v.exact)
            ratios<true>(v, value, difference, ratio);
        else
            ratios<false>(v, value, difference, ratio);
        for (unsigned bit = 0; bit < v.label_bits; ++bit)
            for (std::size_t l = 0; l < lanes; ++l) {
                const float r = ratio[bit][l];
                ratio[bit][l] =
                    speaks[l] * (r > v.saturation ? v.saturation : (r < -v.saturation ? -v.saturation : r));
            }
        for (std::size_t l = 0; l < n; ++l)
            for (unsigned k = 0; k < v.label_bits; ++k)
                out[l * v.label_bits + k] = ratio[v.label_bits - 1 - k][l];
        in += 2 * n, decided += n, out += n * v.label_bits, count -= n;
    }
}

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
