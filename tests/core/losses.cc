// SPDX-License-Identifier: GPL-3.0-or-later
// losses: the exact rate of an impaired link against closed forms, pulses against their definition, taps told
// apart.
#include "halfplane/losses.h"
#include "../../lib/core/impairment.h"
#include "../../lib/core/intersymbol.h"
#include "../../lib/core/pulse_pair.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>

using namespace halfplane;

namespace {

constexpr double pi = 3.141592653589793238462643383279503;

double gaussian_tail(double x)
{
    return std::erfc(x / std::sqrt(2.0)) / 2;
}

/// QPSK on (±1, ±1) that arrives at (i, q) when (1, 1) is sent: each axis errs by itself.
double qpsk_ser(double i, double q, double es_n0)
{
    const double a = gaussian_tail(std::sqrt(es_n0) * i), b = gaussian_tail(std::sqrt(es_n0) * q);
    return a + b - a * b;
}

std::size_t place(int lag)
{
    return column::neighbour(lag) - column::first_neighbour;
}

double distance(const neighbour_taps& a, const neighbour_taps& b)
{
    double sum = 0;
    for (std::size_t l = 0; l < a.size(); ++l)
        sum += std::norm(a[l] - b[l]);
    return std::sqrt(sum);
}

intersymbol_parts split(const neighbour_taps& taps)
{
    std::array<double, 2 * column::reach> variance;
    variance.fill(1e-7);
    return split_taps(taps, variance);
}

} // namespace

TEST(Losses, RateWithoutImpairmentIsThePredictors)
{
    const predictor p(named_set("cross:32"));
    impairment none;
    none.n0 = 0.02;
    EXPECT_NEAR(ln_ser(p, none), p.ln_ser(50), 1e-9);
}

TEST(Losses, RateUnderAnEchoAgainstTheClosedForm)
{
    // The neighbour adds ±h to each axis, the four signs equally often.
    const predictor p(named_set("psk:4"));
    const double h = 0.15, es_n0 = from_db(11);
    impairment echo;
    echo.n0 = 1 / es_n0;
    echo.taps[place(-2)] = h;
    double expected = 0;
    for (const double i : {1 + h, 1 - h})
        for (const double q : {1 + h, 1 - h})
            expected += qpsk_ser(i, q, es_n0) / 4;
    EXPECT_NEAR(ln_ser(p, echo), std::log(expected), 1e-9);
}

TEST(Losses, RateUnderPhaseNoiseAgainstQuadrature)
{
    // The corner (1, 1) turned by φ arrives at √2·(cos, sin)(π/4 + φ); Simpson over ±8 standard deviations.
    const predictor p(named_set("psk:4"));
    const double deviation = 0.1, es_n0 = from_db(12);
    impairment noisy;
    noisy.n0 = 1 / es_n0;
    noisy.phase_variance = deviation * deviation;
    noisy.gain = std::exp(-noisy.phase_variance / 2); // what least squares sees of a gain of 1
    double expected = 0;
    constexpr int steps = 4000;
    for (int k = 0; k <= steps; ++k) {
        const double z = 16.0 * k / steps - 8, angle = pi / 4 + z * deviation;
        const double weight = (k == 0 || k == steps ? 1 : k % 2 ? 4 : 2) * 16.0 / steps / 3;
        expected += weight * std::exp(-z * z / 2) / std::sqrt(2 * pi) *
                    qpsk_ser(std::sqrt(2.0) * std::cos(angle), std::sqrt(2.0) * std::sin(angle), es_n0);
    }
    EXPECT_NEAR(ln_ser(p, noisy), std::log(expected), 1e-8);
}

TEST(Losses, RateUnderSeveralNeighboursAndPhaseAgainstBruteForce)
{
    // 4³ neighbourhoods by Simpson over the phase; the sample of the library may be off by 0.02 dB, about 2 %
    // here.
    const predictor p(named_set("psk:4"));
    const double deviation = 0.08, es_n0 = from_db(11);
    impairment link;
    link.n0 = 1 / es_n0;
    link.phase_variance = deviation * deviation;
    link.gain = std::exp(-link.phase_variance / 2);
    const double taps[] = {0.1, -0.06, 0.05};
    link.taps[place(-1)] = taps[0];
    link.taps[place(1)] = taps[1];
    link.taps[place(3)] = taps[2];
    double expected = 0;
    constexpr int steps = 200;
    for (int around = 0; around < 64; ++around) {
        complex isi = 0;
        for (int t = 0; t < 3; ++t) {
            const int corner = around >> (2 * t) & 3;
            isi += taps[t] * complex(corner & 1 ? 1 : -1, corner & 2 ? 1 : -1);
        }
        for (int k = 0; k <= steps; ++k) {
            const double z = 12.0 * k / steps - 6;
            const double weight = (k == 0 || k == steps ? 1 : k % 2 ? 4 : 2) * 12.0 / steps / 3 / 64;
            const complex at = std::polar(1.0, z * deviation) * complex(1, 1) + link.gain * isi;
            expected +=
                weight * std::exp(-z * z / 2) / std::sqrt(2 * pi) * qpsk_ser(at.real(), at.imag(), es_n0);
        }
    }
    std::cout << "off by " << ln_ser(p, link) - std::log(expected) << " in ln SER\n";
    EXPECT_NEAR(ln_ser(p, link), std::log(expected), 0.02);
}

TEST(Losses, RateUnderOvalNoise)
{
    // Noise on I twice as strong as on Q.
    const predictor p(signal_set::with_natural_labels({{1, 1}, {-1, 1}, {-1, -1}, {1, -1}}));
    impairment link;
    const double es_n0 = from_db(10);
    link.n0 = 1 / es_n0;
    link.noise_square = 1.0 / 3;
    const double a = gaussian_tail(std::sqrt(es_n0 * 3 / 4)), b = gaussian_tail(std::sqrt(es_n0 * 3 / 2));
    EXPECT_NEAR(ln_ser(p, link), std::log(a + b - a * b), 1e-9);
}

TEST(Losses, TheCurveIsInverted)
{
    const predictor p(named_set("qam:16"));
    const ser_curve curve(p);
    for (const double db : {-10.0, 3.0, 17.3, 40.0})
        EXPECT_NEAR(es_n0_db_of(curve, p.ln_ser(from_db(db)), 12), db, 1e-8);
    EXPECT_EQ(es_n0_db_of(curve, -0.01, 12), ser_curve::lowest_db); // more errors than noise makes
}

TEST(Pulses, RaisedCosine)
{
    EXPECT_NEAR(raised_cosine(0, 0.35), 1, 1e-15);
    for (int k = 1; k < 5; ++k)
        EXPECT_NEAR(raised_cosine(k, 0.35), 0, 1e-15);
    // Removable gap at t = 1/(2α): (π/4)·sinc(t).
    EXPECT_NEAR(raised_cosine(1.25, 0.4), pi / 4 * std::sin(1.25 * pi) / (1.25 * pi), 1e-12);
    EXPECT_NEAR(raised_cosine(1.25 + 1e-6, 0.4), raised_cosine(1.25, 0.4), 1e-5);
    EXPECT_NEAR(raised_cosine(0.5, 1), 0.5, 1e-12); // (2/π)·cos(π/2)/0 at t = 1/2: (2/π)·(π/4)
}

TEST(Pulses, PairOfRootRaisedCosines)
{
    for (const double a : {0.02, 0.2, 0.5, 1.0}) {
        const auto same = response_of(a, a);
        EXPECT_NEAR(same[0], 1, 1e-9);
        for (std::size_t k = 1; k < same.size(); ++k)
            EXPECT_NEAR(same[k], 0, 1e-9);
    }
    // 0.2 against 0.6 by the midpoint rule over 1e6 places of the product of spectra.
    const auto root = [](double f, double a) {
        const double flat = (1 - a) / 2;
        return f <= flat ? 1 : f >= 1 - flat ? 0 : std::sqrt((1 + std::cos(pi / a * (f - flat))) / 2);
    };
    pair_response expected{};
    constexpr int places = 1000000;
    for (int k = 0; k < places; ++k) {
        const double f = (k + 0.5) / places;
        const double both = root(f, 0.2) * root(f, 0.6) * 2 / places;
        for (std::size_t lag = 0; lag < expected.size(); ++lag)
            expected[lag] += both * std::cos(2 * pi * f * static_cast<double>(lag));
    }
    const auto got = response_of(0.2, 0.6);
    for (std::size_t lag = 0; lag < expected.size(); ++lag)
        EXPECT_NEAR(got[lag], expected[lag], 1e-9);
}

TEST(Pulses, PairIsFoundByItsTaps)
{
    for (const auto& [a, b] : {std::pair{0.2, 0.6}, {0.25, 0.4}, {0.1, 1.0}}) {
        const auto truth = response_of(a, b);
        std::array<double, column::reach> taps;
        for (std::size_t k = 0; k < taps.size(); ++k)
            taps[k] = truth[k + 1] / truth[0];
        const auto found = find_pair(taps);
        ASSERT_TRUE(found);
        std::cout << a << " and " << b << ": gain " << (*found)[0] << ", " << truth[0] << " in truth\n";
        EXPECT_NEAR((*found)[0], truth[0], 1e-3); // 0.01 dB
    }
    EXPECT_FALSE(find_pair({0.1, 0.1, -0.1, 0.1}));
}

TEST(Taps, AnEcho)
{
    for (const int lag : {-4, -1, 1, 2}) {
        neighbour_taps taps{};
        taps[place(lag)] = std::polar(0.05, 1.0 + lag);
        const auto parts = split(taps);
        EXPECT_LT(distance(parts.echo, taps), 1e-12) << lag;
        EXPECT_EQ(parts.timing_gain, 1);
        EXPECT_EQ(parts.filter_gain, 1);
    }
}

TEST(Taps, ATimingError)
{
    for (const double delay : {-0.1, 0.03, 0.2})
        for (const double roll_off : {0.2, 0.5}) {
            neighbour_taps taps{};
            for (int lag = 1; lag <= column::reach; ++lag)
                for (const int l : {lag, -lag})
                    taps[place(l)] = raised_cosine(l - delay, roll_off) / raised_cosine(delay, roll_off);
            const auto parts = split(taps);
            EXPECT_LT(distance(parts.timing, taps), 1e-12) << delay << ' ' << roll_off;
            EXPECT_NEAR(parts.delay, delay, 0.01);
            EXPECT_NEAR(parts.timing_gain, raised_cosine(delay, roll_off), 2e-3);
        }
}

TEST(Taps, Filters)
{
    const auto response = response_of(0.2, 0.6);
    neighbour_taps taps{};
    for (int lag = 1; lag <= column::reach; ++lag)
        taps[place(lag)] = taps[place(-lag)] = response[static_cast<std::size_t>(lag)] / response[0];
    const auto parts = split(taps);
    EXPECT_LT(distance(parts.filter, taps), 1e-12);
    EXPECT_NEAR(parts.filter_gain, response[0], 1e-3);
}

TEST(Taps, Together)
{
    neighbour_taps timing{}, echo{};
    for (int lag = 1; lag <= column::reach; ++lag)
        for (const int l : {lag, -lag})
            timing[place(l)] = raised_cosine(l - 0.1, 0.35) / raised_cosine(0.1, 0.35);
    echo[place(-3)] = complex(0.02, 0.06);
    auto taps = timing;
    for (std::size_t l = 0; l < taps.size(); ++l)
        taps[l] += echo[l];
    const auto parts = split(taps);
    EXPECT_LT(distance(parts.timing, timing), 0.01);
    EXPECT_LT(distance(parts.echo, echo), 0.01);
    neighbour_taps sum{};
    for (std::size_t l = 0; l < taps.size(); ++l)
        sum[l] = parts.timing[l] + parts.echo[l] + parts.filter[l];
    EXPECT_LT(distance(sum, taps), 1e-15);
}
