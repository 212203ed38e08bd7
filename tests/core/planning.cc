// SPDX-License-Identifier: GPL-3.0-or-later
// planning: against binomial sums in mpmath, published Poisson limits, and its own definition.
#include "halfplane/planning.h"
#include "halfplane/interval.h"

#include "tables/planning.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <functional>
#include <stdexcept>
#include <string>

using namespace halfplane;

namespace {

std::string refusal(const std::function<void()>& f)
{
    try {
        f();
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(Planning, ShortestTestIsExact)
{
    for (const auto& row : shortest_rows)
        EXPECT_EQ(plan_test(row.target, row.confidence, row.allowed).trials, row.trials)
            << row.target << ' ' << row.confidence << ' ' << row.allowed;
}

TEST(Planning, PassProbabilityEqualsTheBinomialSum)
{
    double worst = 0;
    for (const auto& row : pass_rows) {
        const double got = pass_probability({row.trials, row.allowed}, row.rate);
        worst = std::max(worst, std::abs(got / row.pass - 1));
        EXPECT_NEAR(got / row.pass, 1, 1e-10) << row.trials << ' ' << row.allowed << ' ' << row.rate;
    }
    std::printf("pass probability: worst relative error %.2g\n", worst);
}

TEST(Planning, PublishedPoissonLimits)
{
    // Upper 95 % limits of a Poisson mean for 0 … 5 events (E. L. Crow and R. S. Gardner, Biometrika 46
    // (1959) 441 quote Garwood's; values from memory): 3.00, 4.74, 6.30, 7.75, 9.15, 10.51.
    const double limit[] = {2.996, 4.744, 6.296, 7.754, 9.154, 10.513};
    for (std::uint64_t k = 0; k < 6; ++k)
        EXPECT_NEAR(static_cast<double>(plan_test(1e-9, 0.95, k).trials) * 1e-9, limit[k], 1e-3);
}

TEST(Planning, NoErrorsInClosedForm)
{
    for (double p : {0.5, 0.1, 1e-3, 1e-7})
        for (double c : {0.5, 0.9, 0.95, 0.99})
            EXPECT_EQ(static_cast<double>(plan_test(p, c).trials),
                      std::ceil(std::log(1 - c) / std::log1p(-p) - 1e-9));
}

TEST(Planning, ConsumerIsProtectedAndNoTrialIsWasted)
{
    for (double p : {0.2, 3e-4, 1e-8})
        for (double c : {0.8, 0.95})
            for (std::uint64_t k : {0u, 2u, 50u}) {
                const auto test = plan_test(p, c, k);
                EXPECT_LE(pass_probability(test, p), (1 - c) * (1 + 1e-12));
                EXPECT_GT(pass_probability({test.trials - 1, k}, p), (1 - c) * (1 - 1e-9));
            }
}

TEST(Planning, CharacteristicFallsAndItsInverseInverts)
{
    const auto test = plan_test(1e-6, 0.95, 3);
    EXPECT_EQ(pass_probability(test, 0), 1);
    EXPECT_EQ(pass_probability(test, 1), 0);
    double last = 1;
    for (double rate = 1e-9; rate < 1e-3; rate *= 1.3) {
        const double pass = pass_probability(test, rate);
        EXPECT_LE(pass, last);
        last = pass;
    }
    for (double chance : {1e-12, 0.05, 0.5, 0.95, 0.9999})
        EXPECT_NEAR(pass_probability(test, rate_at_pass_probability(test, chance)) / chance, 1, 1e-9);
    EXPECT_NEAR(rate_at_pass_probability(test, 0.05) / 1e-6, 1, 1e-6);
    // The upper end of the one-sided Clopper-Pearson interval is the same number.
    EXPECT_NEAR(binomial_interval(3, test.trials, 0.9).high / rate_at_pass_probability(test, 0.05), 1, 1e-9);
}

TEST(Planning, RowsSayHowLong)
{
    plan_request request;
    request.target = 1e-6;
    request.trials_per_symbol = 4;
    request.symbol_rate = 1e6;
    const auto rows = plan(request, {0, 3});
    ASSERT_EQ(rows.size(), 2u);
    EXPECT_EQ(rows[0].test.trials, 2995731u);
    EXPECT_EQ(rows[0].symbols, 748933);
    EXPECT_NEAR(rows[0].seconds, 0.748933, 1e-12);
    EXPECT_GT(rows[1].symbols, rows[0].symbols);
    // More errors allowed: longer, and fairer to a good link.
    EXPECT_GT(rows[1].rate_usually_pass, 5 * rows[0].rate_usually_pass);
    EXPECT_NEAR(rows[0].rate_half_pass, std::log(2.0) / 2995731, 1e-12);
    request.dispersion = 2;
    EXPECT_EQ(plan(request, {0})[0].symbols, std::ceil(2 * 2995731 / 4.0));
}

TEST(Planning, RefusalsNameTheValue)
{
    EXPECT_EQ(refusal([] { plan_test(0, 0.95); }), "target must lie between 0 and 1, got 0");
    EXPECT_EQ(refusal([] { plan_test(1, 0.95); }), "target must lie between 0 and 1, got 1");
    EXPECT_EQ(refusal([] { plan_test(NAN, 0.95); }), "target must lie between 0 and 1, got nan");
    EXPECT_EQ(refusal([] { plan_test(0.1, 95); }), "confidence must lie between 0 and 1, got 95");
    EXPECT_EQ(refusal([] { plan_test(1e-25, 0.95); }), "target 1e-25 takes more than 1e+19 trials");
    EXPECT_EQ(refusal([] {
                  pass_probability({5, 5}, 0.1);
              }),
              "allowed errors must be fewer than the trials: 5 of 5");
    EXPECT_EQ(refusal([] { pass_probability({5, 1}, -0.1); }), "rate must lie in 0 … 1, got -0.1");
    EXPECT_EQ(refusal([] { rate_at_pass_probability({5, 1}, 0); }), "chance must lie between 0 and 1, got 0");
    plan_request request{1e-3};
    request.trials_per_symbol = 0;
    EXPECT_EQ(refusal([&] { plan(request); }), "trials_per_symbol must be a number above 0, got 0");
    request = {1e-3};
    request.dispersion = 0.5;
    EXPECT_EQ(refusal([&] { plan(request); }), "dispersion must be 1 or more, got 0.5");
    request = {1e-3};
    request.symbol_rate = -1;
    EXPECT_EQ(refusal([&] { plan(request); }), "symbol_rate must be a number of symbols a second, got -1");
}
