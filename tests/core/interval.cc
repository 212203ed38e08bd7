// SPDX-License-Identifier: GPL-3.0-or-later
// interval: against limits solved from their definition with mpmath (tables/interval.py), and every refusal.
#include "halfplane/interval.h"

#include "tables/interval.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <limits>
#include <stdexcept>
#include <string>

using halfplane::binomial_interval;
using halfplane::clumped_interval;

namespace {

double relative(double value, double reference)
{
    return std::abs(value / reference - 1);
}

template <typename F>
std::string refusal(F f)
{
    try {
        f();
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(Interval, BinomialEqualsItsDefinition)
{
    double worst = 0;
    for (const auto& row : binomial_rows) {
        const auto got = binomial_interval(row.errors, row.trials, row.confidence);
        ASSERT_TRUE(got.low);
        worst = std::max({worst, relative(*got.low, row.low), relative(got.high, row.high)});
        EXPECT_LT(relative(*got.low, row.low), halfplane::interval_accuracy)
            << row.errors << " of " << row.trials;
        EXPECT_LT(relative(got.high, row.high), halfplane::interval_accuracy)
            << row.errors << " of " << row.trials;
    }
    std::printf("binomial, worst relative error of an end: %.2g\n", worst);
}

TEST(Interval, ClumpedEqualsItsDefinition)
{
    double worst = 0;
    for (const auto& row : clumped_rows) {
        const auto got = clumped_interval(row.errors, row.trials, row.dispersion, row.confidence);
        ASSERT_TRUE(got.low);
        worst = std::max({worst, relative(*got.low, row.low), relative(got.high, row.high)});
        EXPECT_LT(relative(*got.low, row.low), halfplane::interval_accuracy)
            << row.errors << " of " << row.trials;
        EXPECT_LT(relative(got.high, row.high), halfplane::interval_accuracy)
            << row.errors << " of " << row.trials;
    }
    std::printf("clumped, worst relative error of an end: %.2g\n", worst);
}

TEST(Interval, NoErrorsGiveAnUpperEndOnly)
{
    // (1 − p)^n = 0.05; for large n the "rule of three", −ln 0.05 = 2.9957 over n.
    const auto few = binomial_interval(0, 10, 0.95);
    EXPECT_FALSE(few.low);
    EXPECT_NEAR(std::pow(1 - few.high, 10), 0.05, 1e-15);
    EXPECT_NEAR(binomial_interval(0, 1000000000, 0.95).high, 2.995732273553991e-9, 1e-17);
    const auto clumped = clumped_interval(0, 1000, 2, 0.95);
    EXPECT_FALSE(clumped.low);
    EXPECT_NEAR(clumped.high, 2 * 2.995732273553991e-3, 1e-15);
    EXPECT_EQ(clumped_interval(0, 2, 3, 0.95).high, 1.0);
}

TEST(Interval, AllErrorsReachOneAndSmallDispersionIsOne)
{
    EXPECT_EQ(binomial_interval(7, 7, 0.9).high, 1.0);
    EXPECT_EQ(clumped_interval(1000, 1000, 1, 0.9).high, 1.0);
    EXPECT_EQ(clumped_interval(5, 1000, 0.2, 0.9).high, clumped_interval(5, 1000, 1, 0.9).high);
}

TEST(Interval, RefusalsNameTheValue)
{
    EXPECT_EQ(refusal([] { binomial_interval(0, 0, 0.95); }), "trials must be above 0, got 0");
    EXPECT_EQ(refusal([] { binomial_interval(3, 2, 0.95); }), "errors must not exceed trials: 3 of 2");
    EXPECT_EQ(refusal([] { binomial_interval(1, 2, 1); }), "confidence must lie between 0 and 1, got 1");
    EXPECT_EQ(refusal([] { clumped_interval(1, 2, 1, -0.5); }),
              "confidence must lie between 0 and 1, got -0.5");
    EXPECT_EQ(refusal([] { clumped_interval(1, 2, std::numeric_limits<double>::quiet_NaN(), 0.5); }),
              "dispersion must be finite, got nan");
}
