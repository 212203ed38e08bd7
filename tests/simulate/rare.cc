// SPDX-License-Identifier: GPL-3.0-or-later
// simulate_rare: importance sampling against the exact rung from 1e-1 to 1e-200.
#include "halfplane/simulate.h"

#include "../kernels/sample_sets.h"
#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <cmath>

using namespace halfplane;

namespace {
constexpr double z_limit = 4.8916; // two-sided 1 − 1e-6, fixed seeds
}

TEST(rare, agrees_with_the_exact_rates_down_to_1e_200)
{
    unsigned seed = 0;
    double worst = 0;
    for (const signal_set& set : {sample_sets::ring(2),
                                  sample_sets::ring(8),
                                  sample_sets::two_rings(4, 8, 2.1),
                                  sample_sets::grid(4, 4),
                                  sample_sets::random(33, 2),
                                  sample_sets::grid(16, 16)}) {
        const predictor exact(set);
        for (const double ser : {1e-1, 1e-3, 1e-6, 1e-9, 1e-12, 1e-15, 1e-50, 1e-200}) {
            simulation_options options;
            options.es_n0 = exact.es_n0_for_ser(ser).value();
            options.seed = ++seed;
            const rare_simulation run = simulate_rare(set, options, 0.02);
            const double expected_ser = exact.ser(options.es_n0), expected_ber = exact.ber(options.es_n0);
            const double z_ser = (run.ser.value - expected_ser) / run.ser.standard_error;
            const double z_ber = (run.ber.value - expected_ber) / run.ber.standard_error;
            std::printf("%-10s SER %.4e: simulated %.4e, z = %+.2f; BER z = %+.2f; %llu draws, %.2f s\n",
                        set.name().c_str(),
                        expected_ser,
                        run.ser.value,
                        z_ser,
                        z_ber,
                        static_cast<unsigned long long>(run.symbols),
                        run.seconds);
            EXPECT_LT(std::abs(z_ser), z_limit) << set.name();
            EXPECT_LT(std::abs(z_ber), z_limit) << set.name();
            EXPECT_LT(run.ser.standard_error, 0.025 * run.ser.value);
            EXPECT_GT(run.ser.standard_error, 0.0);
            worst = std::max({worst, std::abs(z_ser), std::abs(z_ber)});
        }
    }
    std::printf("worst |z| %.2f\n", worst);
}

TEST(rare, its_own_error_tells_the_scatter)
{
    // 200 short runs: the scatter of the estimates about the exact value over the stated error is χ²
    // distributed with 200 degrees of freedom, 5.0 standard deviations (√400) allowed.
    const signal_set set = sample_sets::two_rings(4, 8, 2.1);
    const predictor exact(set);
    simulation_options options;
    options.es_n0 = exact.es_n0_for_ser(1e-9).value();
    const double expected = exact.ser(options.es_n0);
    double chi2 = 0, mean = 0;
    constexpr int runs = 200;
    for (int r = 0; r < runs; ++r) {
        options.seed = 1000 + static_cast<unsigned>(r);
        const rare_simulation run = simulate_rare(set, options, 0.05);
        const double z = (run.ser.value - expected) / run.ser.standard_error;
        chi2 += z * z, mean += z;
    }
    std::printf("chi2 of %d runs: %.1f; mean z · √n = %+.2f\n", runs, chi2, mean / std::sqrt(runs));
    EXPECT_NEAR(chi2, runs, 5 * std::sqrt(2.0 * runs));
    EXPECT_LT(std::abs(mean) / std::sqrt(runs), z_limit);
}

TEST(rare, map_rule_and_displaced_means)
{
    const signal_set set = sample_sets::with_shaped_priors(sample_sets::two_rings(4, 8, 2.1), 1.0);
    for (const detector rule : {detector::map, detector::ml}) {
        const predictor exact(set, std::make_shared<awgn>(), rule);
        simulation_options options;
        options.rule = rule;
        options.es_n0 = exact.es_n0_for_ser(1e-10).value();
        const rare_simulation run = simulate_rare(set, options, 0.02);
        EXPECT_LT(std::abs(run.ser.value - exact.ser(options.es_n0)), z_limit * run.ser.standard_error);
        EXPECT_LT(std::abs(run.ber.value - exact.ber(options.es_n0)), z_limit * run.ber.standard_error);
    }
    // A pair ±1 moved along its axis by 0.3: (Q(1.3/σ) + Q(0.7/σ))/2.
    simulation_options options;
    options.es_n0 = from_db(17);
    options.means = {1.3, -0.7};
    const double sigma = std::sqrt(1 / options.es_n0 / 2);
    const double expected =
        (std::erfc(1.3 / sigma / std::sqrt(2.0)) + std::erfc(0.7 / sigma / std::sqrt(2.0))) / 4;
    const rare_simulation run = simulate_rare(sample_sets::ring(2), options, 0.02);
    std::printf("moved pair %.4e: simulated %.4e ± %.1e\n", expected, run.ser.value, run.ser.standard_error);
    EXPECT_LT(std::abs(run.ser.value - expected), z_limit * run.ser.standard_error);
}

TEST(rare, one_thread_or_many_draw_the_same)
{
    simulation_options options;
    options.es_n0 = from_db(20);
    options.threads = 1;
    const rare_simulation one = simulate_rare(sample_sets::grid(4, 4), options);
    options.threads = 5;
    const rare_simulation many = simulate_rare(sample_sets::grid(4, 4), options);
    EXPECT_EQ(one.ser.value, many.ser.value);
    EXPECT_EQ(one.ber.standard_error, many.ber.standard_error);
    EXPECT_EQ(one.symbols, many.symbols);
}

TEST(rare, refuses_what_it_cannot_do)
{
    simulation_options options;
    EXPECT_THROW(simulate_rare(sample_sets::ring(4), options, 0.0), std::invalid_argument);
    EXPECT_THROW(simulate_rare(sample_sets::ring(4), options, 1.0), std::invalid_argument);
    options.es_n0 = from_db(40); // e^−5000
    EXPECT_THROW(simulate_rare(sample_sets::ring(4), options), std::invalid_argument);
}
