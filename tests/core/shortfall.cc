// SPDX-License-Identifier: GPL-3.0-or-later
// shortfall: the interpolated curve, single stretches against the inverse of the curve, wander, bias of short
// stretches, missing ends.
#include "halfplane/shortfall.h"

#include <gtest/gtest.h>

#include <cmath>
#include <iostream>
#include <random>

using namespace halfplane;

namespace {

signal_set qam16()
{
    std::vector<complex> points;
    for (int q = -3; q <= 3; q += 2)
        for (int i = -3; i <= 3; i += 2)
            points.emplace_back(i, q);
    return signal_set::with_natural_labels(std::move(points));
}

const predictor& source()
{
    static const predictor p(qam16());
    return p;
}

} // namespace

TEST(SerCurve, InterpolatesTheExactRung)
{
    const ser_curve curve(source());
    std::mt19937 random(1);
    std::uniform_real_distribution<double> db(-20, 35);
    double worst = 0, worst_slope = 0, worst_curvature = 0;
    for (int k = 0; k < 2000; ++k) {
        const double x = db(random), h = 1e-3;
        const auto at = [](double y) { return source().ln_ser(from_db(y)); };
        const auto v = curve.at(x);
        worst = std::max(worst, std::abs(v.ln_ser - at(x)) / std::max(1.0, std::abs(at(x))));
        const double slope = (at(x + h) - at(x - h)) / (2 * h);
        worst_slope = std::max(worst_slope, std::abs(v.slope - slope) / std::max(1.0, std::abs(slope)));
        const auto next = curve.at(x + h), last = curve.at(x - h);
        worst_curvature = std::max(worst_curvature,
                                   std::abs(v.curvature - (next.slope - last.slope) / (2 * h)) /
                                       std::max(1.0, std::abs(v.curvature)));
    }
    std::cout << "ln SER off by " << worst << ", slope by " << worst_slope << ", curvature by "
              << worst_curvature << '\n';
    EXPECT_LE(worst, ser_curve::accuracy);
    EXPECT_LE(worst_slope, 1e-6); // the central difference's own error is h²/6 of the third derivative
    EXPECT_LE(worst_curvature, 1e-4);
    EXPECT_EQ(curve.at(500).ln_ser, curve.at(200).ln_ser);
    EXPECT_EQ(curve.at(-500).ln_ser, curve.at(-60).ln_ser);
}

TEST(Shortfall, OneStretchIsTheInverseOfTheCurve)
{
    const ser_curve curve(source());
    for (double ser : {0.2, 1e-2, 1e-5, 1e-9}) {
        const std::uint64_t errors = 1000, n = static_cast<std::uint64_t>(errors / ser);
        snr_record record;
        record.add({n, 17.0, 0.01, 0});
        const auto found = find_shortfall(record, curve, {errors, binomial_interval(errors, n, 0.95)});
        const double rate = static_cast<double>(errors) / static_cast<double>(n);
        ASSERT_TRUE(found.db && found.low && found.high);
        EXPECT_NEAR(*found.db, 17.0 - to_db(*source().es_n0_for_ser(rate)), 1e-9) << ser;
        // No covariance: quadrature of 1.96·0.1 dB and of the binomial end.
        const double a =
            *found.db - (17.0 - to_db(*source().es_n0_for_ser(*binomial_interval(errors, n, 0.95).low)));
        EXPECT_NEAR(*found.db - *found.low, std::hypot(a, 0.19599639845400545), 1e-7);
    }
}

TEST(Shortfall, WanderInventsNothing)
{
    // A link exactly on its curve whose Es/N0 swings ±1 dB: the sum over stretches finds 0 dB, the mean Es/N0
    // would not.
    const ser_curve curve(source());
    snr_record record;
    double expected = 0, mean = 0;
    const int stretches = 3000;
    const std::uint64_t each = 100000000;
    for (int k = 0; k < stretches; ++k) {
        const double db = 17 + std::sin(0.1 * k);
        record.add({each, db});
        expected += static_cast<double>(each) * source().ser(from_db(db));
        mean += db / stretches;
    }
    const auto errors = static_cast<std::uint64_t>(std::llround(expected));
    const std::uint64_t n = each * stretches;
    const auto found = find_shortfall(record, curve, {errors, binomial_interval(errors, n, 0.95)});
    const double by_mean = mean - to_db(*source().es_n0_for_ser(expected / static_cast<double>(n)));
    std::cout << "by the sum " << *found.db << " dB, by the mean Es/N0 " << by_mean << " dB\n";
    EXPECT_NEAR(*found.db, 0, 1e-5); // bins of 2^-8 dB keep their spread; what is left is of fourth order
    EXPECT_GT(std::abs(by_mean), 0.1);
}

TEST(Shortfall, ScatterOfTheGaugeIsNotTakenForWander)
{
    // 4,000 stretches at 17 dB, each gauged with its own error of 0.3 dB, on the curve: the convexity of SER
    // alone would report ½·|slope|·variance. Tolerance: four standard errors of the mean γ, and a tenth of
    // the bias for higher orders.
    const ser_curve curve(source());
    snr_record corrected, naive;
    std::mt19937_64 random(3);
    std::normal_distribution<double> error(0, 0.3);
    const int stretches = 4000;
    const std::uint64_t each = 100000;
    for (int k = 0; k < stretches; ++k) {
        const double db = 17 + error(random);
        corrected.add({each, db, 0.09, 0});
        naive.add({each, db, 0, 0});
    }
    const std::uint64_t n = each * stretches;
    const auto errors = static_cast<std::uint64_t>(static_cast<double>(n) * source().ser(from_db(17)));
    const shortfall_question asked{errors, binomial_interval(errors, n, 0.95)};
    const double with = *find_shortfall(corrected, curve, asked).db,
                 without = *find_shortfall(naive, curve, asked).db;
    const auto v = curve.at(17);
    const double bias = 0.5 * (v.slope * v.slope + v.curvature) * 0.09 / -v.slope;
    std::cout << "corrected " << with << " dB, uncorrected " << without << " dB, bias by theory " << -bias
              << " dB\n";
    EXPECT_NEAR(with, 0, 4 * 0.3 / std::sqrt(stretches) + 0.1 * bias);
    EXPECT_GT(std::abs(without), 0.5 * bias);
}

TEST(Shortfall, EndsThatTheDataDoNotGiveAreAbsent)
{
    const ser_curve curve(source());
    snr_record record;
    EXPECT_FALSE(find_shortfall(record, curve, {0, {std::nullopt, 0.1}}).high) << "an empty record";
    record.add({10000, 20, 0.01, 0});

    const auto none = find_shortfall(record, curve, {0, binomial_interval(0, 10000, 0.95)});
    ASSERT_TRUE(none.high && !none.db && !none.low);
    EXPECT_NEAR(*none.high,
                20 - to_db(*source().es_n0_for_ser(binomial_interval(0, 10000, 0.95).high)) +
                    1.6448536269514722 * 0.1,
                1e-8);

    // More errors than pure noise makes (15/16): no Es/N0 explains them.
    const auto wrong = find_shortfall(record, curve, {10000, binomial_interval(10000, 10000, 0.95)});
    EXPECT_FALSE(wrong.db || wrong.low || wrong.high);
    const auto nearly = find_shortfall(record, curve, {9376, {0.93, 0.95}});
    EXPECT_TRUE(nearly.low && !nearly.db && !nearly.high);
}

TEST(Shortfall, CovarianceMakesTheIntervalNarrower)
{
    const ser_curve curve(source());
    snr_record independent, coupled;
    independent.add({100000, 15, 0.0004, 0});
    coupled.add({100000, 15, 0.0004, -3000});
    const shortfall_question asked{2000, binomial_interval(2000, 100000, 0.95)};
    const auto a = find_shortfall(independent, curve, asked), b = find_shortfall(coupled, curve, asked);
    EXPECT_EQ(*a.db, *b.db);
    EXPECT_LT(*b.high - *b.low, *a.high - *a.low);
}
