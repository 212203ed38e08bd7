// SPDX-License-Identifier: GPL-3.0-or-later
// pulse_pair: spectra of root raised cosines, multiplied and transformed back.
#include "pulse_pair.h"

#include <boost/math/quadrature/gauss.hpp>

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane {

namespace {

constexpr double pi = 3.141592653589793238462643383279503;
constexpr double least_roll_off = 0.02, most_misfit = 0.1;

/// Root of the raised-cosine spectrum at f cycles a symbol, f ≥ 0.
double amplitude(double f, double roll_off)
{
    const double flat = (1 - roll_off) / 2;
    if (f <= flat)
        return 1;
    if (f >= 1 - flat)
        return 0;
    return std::cos(pi / (2 * roll_off) * (f - flat));
}

} // namespace

double raised_cosine(double t, double roll_off)
{
    const auto sinc = [](double x) { return std::abs(x) < 1e-8 ? 1.0 : std::sin(pi * x) / (pi * x); };
    const double x = 2 * roll_off * t, gap = 1 - x * x;
    // cos(πx/2)/(1 − x²) tends to π/4 at |x| = 1.
    const double shape = std::abs(gap) < 1e-7 ? pi / 4 : std::cos(pi * x / 2) / gap;
    return sinc(t) * shape;
}

pair_response response_of(double roll_off, double other)
{
    // Smooth between these: both flat, one rolling off, both, nothing.
    const double low = (1 - std::max(roll_off, other)) / 2, high = (1 - std::min(roll_off, other)) / 2;
    const double end = (1 + std::min(roll_off, other)) / 2;
    const std::array<double, 4> edges = {0, std::min(low, end), std::min(high, end), end};
    pair_response out{};
    using rule = boost::math::quadrature::gauss<double, 20>;
    for (std::size_t lag = 0; lag < out.size(); ++lag)
        for (std::size_t k = 0; k + 1 < edges.size(); ++k)
            if (edges[k + 1] > edges[k])
                out[lag] += 2 * rule::integrate(
                                    [&](double f) {
                                        return amplitude(f, roll_off) * amplitude(f, other) *
                                               std::cos(2 * pi * f * static_cast<double>(lag));
                                    },
                                    edges[k],
                                    edges[k + 1]);
    return out;
}

std::optional<pair_response> find_pair(const std::array<double, column::reach>& taps)
{
    const auto misfit = [&](const pair_response& r) {
        double sum = 0;
        for (std::size_t k = 0; k < taps.size(); ++k)
            sum += std::pow(taps[k] - r[k + 1] / r[0], 2);
        return sum;
    };
    double least = std::numeric_limits<double>::infinity(), first = 0, second = 0, step = 0.08;
    pair_response best{};
    const auto consider = [&](double a, double b) {
        a = std::clamp(a, least_roll_off, 1.0);
        b = std::clamp(b, least_roll_off, 1.0);
        const auto r = response_of(a, b);
        if (const double m = misfit(r); m < least) {
            least = m;
            best = r;
            first = a;
            second = b;
        }
    };
    for (double a = 0.04; a <= 1; a += step)
        for (double b = a; b <= 1; b += step)
            consider(a, b);
    for (int round = 0; round < 10; ++round) {
        step /= 1.6;
        const double a = first, b = second;
        for (const int i : {-1, 0, 1})
            for (const int j : {-1, 0, 1})
                consider(a + i * step, b + j * step);
    }
    double power = 0;
    for (const double t : taps)
        power += t * t;
    if (!(least < most_misfit * power))
        return std::nullopt;
    return best;
}

} // namespace halfplane
