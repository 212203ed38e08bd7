// SPDX-License-Identifier: GPL-3.0-or-later
// wedge: Gauss–Legendre in Cartesian or hyperbolic coordinates, whichever is smooth over the edge.
#include "halfplane/wedge.h"

#include "quadrature_rule.h"

#include <algorithm>
#include <cstdint>
#include <cstring>
#include <limits>

namespace halfplane {

namespace {

constexpr double two_pi = 6.283185307179586476925286766559;
/// Where the integrand has fallen by exp(−negligible_drop) the rest of an edge counts for nothing.
constexpr double negligible_drop = 38;

/// a² to twice double precision (Dekker, Numer. Math. 18 (1971) 224): a² = high + low.
struct square {
    double high, low;
    explicit square(double a) : high(a * a)
    {
        const double split = 134217729.0 * a; // 2^27 + 1
        const double top = split - (split - a), rest = a - top;
        low = ((top * top - high) + 2 * top * rest) + rest * rest;
    }
};

/// (h² + a²)/2 as exponent and a factor near 1 that repairs its rounding, which exp() would magnify.
wedge_value closest_approach(double h, double a)
{
    if (h > 1e5 || a > 1e5) // the rounding of an exponent above 1e10 is beyond repair, and beyond use
        return {0.5 * h * h + 0.5 * a * a, 1.0};
    const square hh(h), aa(a);
    const double big = std::max(hh.high, aa.high), small = std::min(hh.high, aa.high);
    const double sum = big + small;
    const double lost = small - (sum - big) + hh.low + aa.low;
    return {0.5 * sum, 1 - 0.5 * lost};
}

/// asinh(b/h) − asinh(a/h) without cancellation, R = √(h² + a²).
double hyperbolic_length(double h, double a, double b, double near)
{
    if (std::isinf(b))
        return std::numeric_limits<double>::infinity();
    return std::asinh((b - a) * (a + b) / (b * near + a * std::hypot(h, b)));
}

/*!
 * exp(x) for −700 < x < 1 to 3e-16, without branches or calls so that loops over nodes become vector code:
 * 2^k by the exponent bits, the rest by its series to the 13th power at |r| ≤ ln 2/2.
 */
[[gnu::always_inline]] inline double vector_exp(double x)
{
    constexpr double shifter = 6755399441055744.0; // 1.5·2^52: adding it rounds to a whole number
    const double shifted = x * 1.4426950408889634074 + shifter;
    const double k = shifted - shifter;
    const double r =
        (x - k * 6.93147180369123816490e-01) - k * 1.90821492927058770002e-10; // ln 2 in two parts
    double p =
        1 /
        6227020800.0; // written out: a loop over coefficients would keep the caller's from being vector code
    p = p * r + 1 / 479001600.0;
    p = p * r + 1 / 39916800.0;
    p = p * r + 1 / 3628800.0;
    p = p * r + 1 / 362880.0;
    p = p * r + 1 / 40320.0;
    p = p * r + 1 / 5040.0;
    p = p * r + 1 / 720.0;
    p = p * r + 1 / 120.0;
    p = p * r + 1 / 24.0;
    p = p * r + 1 / 6.0;
    p = p * r + 0.5;
    p = p * r + 1.0;
    p = p * r + 1.0;
    std::int64_t bits, power;
    std::memcpy(&bits, &p, sizeof bits);
    std::memcpy(&power, &shifted, sizeof power);
    bits += static_cast<std::int64_t>(static_cast<std::uint64_t>(power) << 52);
    std::memcpy(&p, &bits, sizeof p);
    return p;
}

template <int N>
[[gnu::always_inline]] inline double cartesian_sum(double h, double a, double length)
{
    const auto& rule = quadrature_rule<N>::get();
    double term[N];
    for (int k = 0; k < N; ++k) {
        const double u = length * rule.node[k];
        const double x = a + u;
        term[k] = rule.weight[k] * vector_exp(-u * (a + 0.5 * u)) / (h * h + x * x);
    }
    double part[4] = {0, 0, 0, 0}; // four sums, so that no addition waits for the one before
    for (int k = 0; k < N; k += 4)
        for (int j = 0; j < 4; ++j)
            part[j] += term[k + j];
    return (part[0] + part[1] + part[2] + part[3]) * length * h / two_pi;
}

#if defined(__x86_64__)
/// The same for processors with vectors of four doubles.
template <int N>
[[gnu::target("avx2,fma")]] double cartesian_wide(double h, double a, double length)
{
    return cartesian_sum<N>(h, a, length);
}

const bool wide_vectors = __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma");
#endif

template <int N>
double cartesian(double h, double a, double length)
{
#if defined(__x86_64__)
    if (wide_vectors)
        return cartesian_wide<N>(h, a, length);
#endif
    return cartesian_sum<N>(h, a, length);
}

/// Number of nodes by λ = length/distance (the pole at ±ih) and by the fall of the exponent over the edge.
double cartesian_of_order(double h, double a, double length, double lambda, double drop)
{
    if (lambda <= 0.003 && drop <= 0.001)
        return cartesian<4>(h, a, length);
    if (lambda <= 0.3 && drop <= 0.2)
        return cartesian<8>(h, a, length);
    if (lambda <= 0.8 && drop <= 2)
        return cartesian<12>(h, a, length);
    if (lambda <= 1.25 && drop <= 10)
        return cartesian<16>(h, a, length);
    if (lambda <= 2 && drop <= 20)
        return cartesian<20>(h, a, length);
    return cartesian<24>(h, a, length);
}

/*!
 * x = h·sinh v along the edge from v(a) on: with w = v − v(a) the distance is r(w) = R cosh w + a sinh w and
 * dθ = h/r dw. All singularities of the integrand lie at a distance of π/2 from the real axis.
 * \param ln_ratio ln of tail at r²/2 over tail at R²/2
 */
template <typename LnRatio>
double hyperbolic(double h, double a, double near, double length, const LnRatio& ln_ratio)
{
    constexpr double panel = 2.0;
    const auto& rule = quadrature_rule<24>::get();
    const int panels = std::max(1, static_cast<int>(std::ceil(length / panel)));
    const double step = length / panels;
    double sum = 0;
    for (int p = 0; p < panels; ++p) {
        double part = 0;
        for (int k = 0; k < 24; ++k) {
            const double w = (p + rule.node[k]) * step;
            const double sinh_w = std::sinh(w), cosh_w = std::sqrt(1 + sinh_w * sinh_w);
            const double r = near * cosh_w + a * sinh_w;
            part += rule.weight[k] * std::exp(ln_ratio(w, sinh_w, cosh_w, r)) * h / r;
        }
        sum += part;
    }
    return sum * step / two_pi;
}

/// One side of the foot, 0 ≤ a < b, less the factor exp(−(h² + a²)/2).
double gaussian_side(double h, double a, double b)
{
    // Beyond √(a² + 2·drop) nothing is left; written so that b − a keeps its digits.
    const double reach = 2 * negligible_drop / (a + std::sqrt(a * a + 2 * negligible_drop));
    const double length = std::min(b - a, reach);
    const double near = std::sqrt(h * h + a * a);
    if (near == 0)
        return 0.25; // the mean on the edge: a right angle of the full circle
    const double lambda = length / near;
    if (lambda <= 3)
        return cartesian_of_order(h, a, length, lambda, length * (a + 0.5 * length));
    if (h == 0)
        return 0; // the mean on the line, but beside the edge
    const double v = std::min(hyperbolic_length(h, a, a + length, near), negligible_drop);
    return hyperbolic(h, a, near, v, [h, a, near](double, double s, double c, double) {
        const double along = a * (c - 1) + near * s; // x − a
        return -along * (a + 0.5 * along);
    });
}

double law_side(const law& channel, double h, double a, double b)
{
    const double near = std::hypot(h, a);
    if (near == 0)
        return 0.25;
    if (h == 0)
        return 0;
    const double ln_near = channel.ln_tail(0.5 * near * near);
    const auto drop = [&](double w) {
        const double r = near * std::cosh(w) + a * std::sinh(w);
        return ln_near - channel.ln_tail(0.5 * r * r) + std::log(r / near);
    };
    double length = std::min(hyperbolic_length(h, a, b, near), negligible_drop);
    if (drop(length) > negligible_drop) {
        double low = 0;
        while (length - low > 0.02 * length) {
            const double middle = 0.5 * (low + length);
            (drop(middle) > negligible_drop ? length : low) = middle;
        }
    }
    return hyperbolic(h, a, near, length, [&](double, double, double, double r) {
        return channel.ln_tail(0.5 * r * r) - ln_near;
    });
}

/// Splits an edge at the foot; `side(a, b)` integrates one side of it.
template <typename Exponent, typename Side>
wedge_value split_at_foot(double x1, double x2, const Exponent& exponent, const Side& side)
{
    if (!(x1 < x2))
        return {exponent(0).exponent, 0};
    if (x1 >= 0 || x2 <= 0) {
        const double a = x1 >= 0 ? x1 : -x2, b = x1 >= 0 ? x2 : -x1;
        if (std::isinf(a))
            return {a, 0};
        auto w = exponent(a);
        w.integral *= side(a, b);
        return w;
    }
    auto w = exponent(0);
    const double left = side(0, -x1);
    w.integral *= left + (x2 == -x1 ? left : side(0, x2));
    return w;
}

} // namespace

wedge_value wedge(double h, double x1, double x2) noexcept
{
    return split_at_foot(
        x1,
        x2,
        [h](double a) { return closest_approach(h, a); },
        [h](double a, double b) { return gaussian_side(h, a, b); });
}

wedge_value wedge(const law& channel, double h, double x1, double x2)
{
    return split_at_foot(
        x1,
        x2,
        [&](double a) {
            return wedge_value{-channel.ln_tail(0.5 * (h * h + a * a)), 1.0};
        },
        [&](double a, double b) { return law_side(channel, h, a, b); });
}

} // namespace halfplane
