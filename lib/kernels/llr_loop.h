// SPDX-License-Identifier: GPL-3.0-or-later
// llr_loop: log-likelihood ratios, sixteen samples abreast. Included once for each target.
#pragma once

#include "llr_stores.h"
#include "llr_view.h"
#include "noise_loop.h"

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

namespace llr_detail {

constexpr float deepest = -2.8e6f; // metrics are clipped here, far beyond any saturation
constexpr float absent = 2 * deepest;
constexpr std::int32_t absent_exponent = -(1 << 24);

/*!
 * A term e^x as fraction·2^exponent, the exponent an integer of its own: terms of one sample differ by
 * factors far beyond the range of a float, and the ratio of an unlikely bit value is made of the small ones
 * alone.
 */
struct scaled {
    float fraction;
    std::int32_t exponent;
};

/// Each x in `fraction` becomes e^x, |x| ≤ 2.8e6. Taylor to the fifth power on ±ln 2 / 2: 3e-6 relative.
inline void exp_of(float* __restrict fraction, std::int32_t* __restrict exponent)
{
    for (std::size_t l = 0; l < lanes; ++l) {
        const float x = fraction[l];
        const float shifted =
            x * 1.44269504088896341f + 12582912.0f; // 1.5·2^23: the integer part in the low bits
        const float f = x - (shifted - 12582912.0f) * 0.693147180559945f;
        float p = 1.0f / 120;
        p = p * f + 1.0f / 24;
        p = p * f + 1.0f / 6;
        p = p * f + 0.5f;
        p = p * f + 1.0f;
        p = p * f + 1.0f;
        fraction[l] = p;
        exponent[l] = static_cast<std::int32_t>(noise_detail::as_bits(shifted) - 0x4b400000u);
    }
}

/// 2^n for n ≤ 0, and 0 below −126.
inline float down(std::int32_t n)
{
    n = n > -127 ? n : -127;
    return noise_detail::as_float(static_cast<std::uint32_t>(n + 127) << 23);
}

inline scaled sum(scaled a, scaled b)
{
    const std::int32_t e = a.exponent > b.exponent ? a.exponent : b.exponent;
    return {a.fraction * down(a.exponent - e) + b.fraction * down(b.exponent - e), e};
}

inline float log_of(float x)
{
    return -noise_detail::minus_log(x, false);
}

inline float larger(float a, float b)
{
    return a > b ? a : b;
}

/// For each sample the metric from which all others are measured: the largest, or one near it.
inline void reference_of(const llr_part& v,
                         const double* x,
                         const double* y,
                         const std::uint16_t* decided,
                         double* __restrict reference)
{
    if (v.near_is_enough) {
        for (std::size_t l = 0; l < lanes; ++l) {
            const std::size_t i = v.place[decided[l]];
            reference[l] = x[l] * v.re[i] + y[l] * v.im[i] + v.constant[i];
        }
        return;
    }
    for (std::size_t l = 0; l < lanes; ++l)
        reference[l] = x[l] * v.re[0] + y[l] * v.im[0] + v.constant[0];
    for (std::size_t i = 1; i < v.size; ++i)
        for (std::size_t l = 0; l < lanes; ++l) {
            const double m = x[l] * v.re[i] + y[l] * v.im[i] + v.constant[i];
            reference[l] = m > reference[l] ? m : reference[l];
        }
}

/*!
 * All bits from one value a label: the top bit splits the rows in halves; combining these halves row by row
 * leaves a table for the bits below. Three operations a pair of rows, 3·2^b in all, instead of b·2^b.
 */
inline void exact_ratios(const llr_part& v,
                         float* __restrict fraction,
                         std::int32_t* __restrict exponent,
                         float (*ratio)[lanes])
{
    for (unsigned bit = v.bits; bit-- > 0;) {
        const std::size_t half = std::size_t{1} << bit;
        float zero_f[lanes], one_f[lanes];
        std::int32_t zero_e[lanes], one_e[lanes];
        for (std::size_t l = 0; l < lanes; ++l) {
            zero_f[l] = fraction[l], zero_e[l] = exponent[l];
            one_f[l] = fraction[half * lanes + l], one_e[l] = exponent[half * lanes + l];
            const scaled both = sum({zero_f[l], zero_e[l]}, {one_f[l], one_e[l]});
            fraction[l] = both.fraction, exponent[l] = both.exponent;
        }
        for (std::size_t j = 1; j < half; ++j) {
            float* low_f = fraction + j * lanes;
            std::int32_t* low_e = exponent + j * lanes;
            const float* high_f = low_f + half * lanes;
            const std::int32_t* high_e = low_e + half * lanes;
            for (std::size_t l = 0; l < lanes; ++l) {
                const scaled low{low_f[l], low_e[l]}, high{high_f[l], high_e[l]};
                const scaled zero = sum({zero_f[l], zero_e[l]}, low), one = sum({one_f[l], one_e[l]}, high);
                const scaled both = sum(low, high);
                zero_f[l] = zero.fraction, zero_e[l] = zero.exponent;
                one_f[l] = one.fraction, one_e[l] = one.exponent;
                low_f[l] = both.fraction, low_e[l] = both.exponent;
            }
        }
        for (std::size_t l = 0; l < lanes; ++l)
            ratio[bit][l] = static_cast<float>(zero_e[l] - one_e[l]) * 0.693147180559945f +
                            (log_of(zero_f[l]) - log_of(one_f[l]));
    }
}

/// The same tree with the largest in place of the sum.
inline void max_ratios(const llr_part& v, float* __restrict value, float (*ratio)[lanes])
{
    for (unsigned bit = v.bits; bit-- > 0;) {
        const std::size_t half = std::size_t{1} << bit;
        float zero[lanes], one[lanes];
        for (std::size_t l = 0; l < lanes; ++l)
            zero[l] = one[l] = absent;
        for (std::size_t j = 0; j < half; ++j) {
            float* low = value + j * lanes;
            const float* high = low + half * lanes;
            for (std::size_t l = 0; l < lanes; ++l) {
                const float a = low[l], b = high[l];
                zero[l] = larger(zero[l], a);
                one[l] = larger(one[l], b);
                low[l] = larger(a, b);
            }
        }
        for (std::size_t l = 0; l < lanes; ++l)
            ratio[bit][l] = zero[l] - one[l];
    }
}

/*!
 * Max-log ratios of a part whose 2^bits labels are all there, in order: the same tree over the metrics
 * themselves. Only the difference of two largest becomes a float, so nothing has to be measured from anywhere
 * first.
 */
template <unsigned bits, typename Metric>
inline void max_ratios_of_all(Metric metric_of, const std::uint8_t* position, float (*ratio)[lanes])
{
    alignas(64) double metric[std::size_t{1} << bits][lanes];
    for (std::size_t i = 0; i < std::size_t{1} << bits; ++i)
        for (std::size_t l = 0; l < lanes; ++l)
            metric[i][l] = metric_of(i, l);
    for (unsigned bit = bits; bit-- > 0;) {
        const std::size_t half = std::size_t{1} << bit;
        alignas(64) double zero[lanes], one[lanes];
        for (std::size_t l = 0; l < lanes; ++l) {
            const double a = metric[0][l], b = metric[half][l];
            zero[l] = a, one[l] = b;
            metric[0][l] = a > b ? a : b;
        }
        for (std::size_t j = 1; j < half; ++j)
            for (std::size_t l = 0; l < lanes; ++l) {
                const double a = metric[j][l], b = metric[j + half][l];
                zero[l] = zero[l] > a ? zero[l] : a;
                one[l] = one[l] > b ? one[l] : b;
                metric[j][l] = a > b ? a : b;
            }
        float* const row = ratio[position[bit]];
        for (std::size_t l = 0; l < lanes; ++l)
            row[l] = static_cast<float>(zero[l] - one[l]);
    }
}

template <typename Metric>
inline bool max_ratios_of_all(const llr_part& v, Metric metric_of, float (*ratio)[lanes])
{
    switch (v.bits) {
    case 1:
        return max_ratios_of_all<1>(metric_of, v.position, ratio), true;
    case 2:
        return max_ratios_of_all<2>(metric_of, v.position, ratio), true;
    case 3:
        return max_ratios_of_all<3>(metric_of, v.position, ratio), true;
    case 4:
        return max_ratios_of_all<4>(metric_of, v.position, ratio), true;
    default:
        return false;
    }
}

inline bool max_ratios_of_all(const llr_part& v, const double* x, const double* y, float (*ratio)[lanes])
{
    if (v.missing_count > 0)
        return false;
    const double *re = v.re, *im = v.im, *constant = v.constant;
    if (v.axis == llr_part::in_phase)
        return max_ratios_of_all(
            v, [=](std::size_t i, std::size_t l) { return x[l] * re[i] + constant[i]; }, ratio);
    if (v.axis == llr_part::quadrature)
        return max_ratios_of_all(
            v, [=](std::size_t i, std::size_t l) { return y[l] * im[i] + constant[i]; }, ratio);
    return max_ratios_of_all(
        v, [=](std::size_t i, std::size_t l) { return x[l] * re[i] + y[l] * im[i] + constant[i]; }, ratio);
}

/// For parts of few points: all metrics are kept, and measured from the largest. No sample is looked up.
template <typename Metric>
inline void few_differences(const llr_part& v, float* __restrict value, Metric metric_of)
{
    alignas(64) double metric[llr_part::most_kept][lanes];
    alignas(64) double top[lanes];
    for (std::size_t l = 0; l < lanes; ++l)
        top[l] = metric[0][l] = metric_of(0, l);
    for (std::size_t i = 1; i < v.size; ++i)
        for (std::size_t l = 0; l < lanes; ++l) {
            const double m = metric_of(i, l);
            metric[i][l] = m;
            top[l] = m > top[l] ? m : top[l];
        }
    for (std::size_t i = 0; i < v.size; ++i)
        for (std::size_t l = 0; l < lanes; ++l)
            value[v.label[i] * lanes + l] = larger(static_cast<float>(metric[i][l] - top[l]), deepest);
}

inline void few_differences(const llr_part& v, const double* x, const double* y, float* value)
{
    const double *re = v.re, *im = v.im, *constant = v.constant;
    if (v.axis == llr_part::in_phase)
        few_differences(v, value, [=](std::size_t i, std::size_t l) { return x[l] * re[i] + constant[i]; });
    else if (v.axis == llr_part::quadrature)
        few_differences(v, value, [=](std::size_t i, std::size_t l) { return y[l] * im[i] + constant[i]; });
    else
        few_differences(v, value, [=](std::size_t i, std::size_t l) {
            return x[l] * re[i] + y[l] * im[i] + constant[i];
        });
}

/// The ratios of a part's bits, each at its position.
inline void part_ratios(const llr_view& whole,
                        const llr_part& v,
                        const double* x,
                        const double* y,
                        const std::uint16_t* near,
                        float* value,
                        std::int32_t* exponent,
                        float (*ratio)[lanes])
{
    alignas(64) float own[16][lanes];
    if (!whole.exact && max_ratios_of_all(v, x, y, ratio))
        return;
    if (v.few()) {
        few_differences(v, x, y, value);
    } else {
        double reference[lanes];
        reference_of(v, x, y, near, reference);
        for (std::size_t i = 0; i < v.size; ++i) {
            const double re = v.re[i], im = v.im[i], constant = v.constant[i];
            float* __restrict const row = value + v.label[i] * lanes;
            for (std::size_t l = 0; l < lanes; ++l)
                row[l] = larger(static_cast<float>(x[l] * re + y[l] * im + constant - reference[l]), deepest);
        }
    }
    if (whole.exact)
        for (std::size_t i = 0; i < v.size; ++i)
            exp_of(value + v.label[i] * lanes, exponent + v.label[i] * lanes);
    for (std::size_t m = 0; m < v.missing_count; ++m)
        for (std::size_t l = 0; l < lanes; ++l) {
            value[v.missing[m] * lanes + l] = whole.exact ? 0.0f : absent;
            exponent[v.missing[m] * lanes + l] = absent_exponent;
        }
    if (whole.exact)
        exact_ratios(v, value, exponent, own);
    else
        max_ratios(v, value, own);
    for (unsigned bit = 0; bit < v.bits; ++bit)
        if (!(v.has_zero >> bit & 1) || !(v.has_one >> bit & 1))
            for (std::size_t l = 0; l < lanes; ++l)
                own[bit][l] = v.has_zero >> bit & 1 ? whole.saturation : -whole.saturation;
    for (unsigned bit = 0; bit < v.bits; ++bit)
        for (std::size_t l = 0; l < lanes; ++l)
            ratio[v.position[bit]][l] = own[bit][l];
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
    using noise_detail::as_bits;
    using noise_detail::as_float;
    const unsigned bits = v.label_bits;
    const float limit = v.saturation;
    const std::uint32_t sign = as_bits(v.sign);
    const std::size_t labels = std::size_t{1} << bits;
    float* const value = scratch;
    std::int32_t* const exponent = reinterpret_cast<std::int32_t*>(scratch + labels * lanes);
    alignas(64) float ratio[16][lanes];
    while (count > 0) {
        const std::size_t n = count < lanes ? count : lanes;
        alignas(64) float sample[2 * lanes] = {};
        std::uint16_t near[lanes] = {};
        __builtin_memcpy(sample, in, 2 * n * sizeof(float));
        if (decided)
            __builtin_memcpy(near, decided, n * sizeof near[0]);
        alignas(64) std::uint32_t finite[lanes]; // all ones, or zero
        alignas(64) double x[lanes], y[lanes];
        alignas(64) float speaks[lanes];
        constexpr std::uint32_t exponent_bits = 0x7f800000u; // all set: infinite, or not a number
        for (std::size_t l = 0; l < lanes; ++l) {
            const std::uint32_t re = as_bits(sample[2 * l]) & exponent_bits,
                                im = as_bits(sample[2 * l + 1]) & exponent_bits;
            finite[l] = (re != exponent_bits) & (im != exponent_bits) ? ~std::uint32_t{0} : 0u;
        }
        for (std::size_t l = 0; l < lanes; ++l) {
            x[l] = static_cast<double>(as_float(as_bits(sample[2 * l]) & finite[l]));
            y[l] = static_cast<double>(as_float(as_bits(sample[2 * l + 1]) & finite[l]));
        }
        for (std::size_t l = 0; l < lanes; ++l)
            speaks[l] = as_float(sign & finite[l]);
        for (std::size_t l = 0; l < lanes; ++l)
            near[l] = static_cast<std::uint16_t>(near[l] & finite[l]);
        for (unsigned p = 0; p < v.parts; ++p)
            part_ratios(v, v.part[p], x, y, near, value, exponent, ratio);
        for (unsigned bit = 0; bit < bits; ++bit)
            for (std::size_t l = 0; l < lanes; ++l) {
                const float low = ratio[bit][l] > -limit ? ratio[bit][l] : -limit;
                ratio[bit][l] = speaks[l] * (low < limit ? low : limit);
            }
        write(ratio, bits, n, out);
        in += 2 * n, out += n * bits, count -= n;
        if (decided)
            decided += n;
    }
}

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
