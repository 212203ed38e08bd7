// SPDX-License-Identifier: GPL-3.0-or-later
// simulate under fading and impulsive laws: counts against the exact rates, and draws of the gain against its
// tail.
#include "halfplane/simulate.h"

#include "../../lib/simulate/gain_sampler.h"
#include "../kernels/sample_sets.h"
#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <cmath>

using namespace halfplane;

namespace {
constexpr double z_limit = 4.8916; // two-sided 1 − 1e-6, fixed seeds
const char* const laws[] = {"rayleigh",
                            "rician:-3",
                            "rician:7",
                            "nakagami:0.5",
                            "nakagami:0.8",
                            "nakagami:3",
                            "rayleigh*3",
                            "rician:4*2",
                            "nakagami:0.7*2",
                            "impulsive:0.1:0.1",
                            "impulsive:0.5:0.01"};
} // namespace

TEST(fading, gains_follow_the_tail_of_the_law)
{
    // E[exp(−G·u)] by its sample mean, whose variance is T(2u) − T(u)².
    constexpr std::size_t count = 400000;
    std::vector<double> gain(count);
    double worst = 0;
    for (const char* name : laws) {
        const std::shared_ptr<const law> channel = parse_law(name);
        gain_sampler::of(*channel)->draw(7, 0, count, gain.data());
        for (const double u : {0.1, 1.0, 5.0, 30.0}) {
            double sum = 0;
            for (const double g : gain)
                sum += std::exp(-g * u);
            const double mean = channel->tail(u), variance = channel->tail(2 * u) - mean * mean;
            const double z = (sum / count - mean) / std::sqrt(variance / count);
            EXPECT_LT(std::abs(z), z_limit) << name << " at u = " << u;
            worst = std::max(worst, std::abs(z));
        }
    }
    std::printf("worst |z| of the tails: %.2f\n", worst);
    EXPECT_EQ(gain_sampler::of(awgn()), nullptr);
}

TEST(fading, any_stretch_of_gains_can_be_drawn_anywhere)
{
    std::vector<double> whole(10000), part(1000);
    for (const char* name : laws) {
        const auto sampler = gain_sampler::of(*parse_law(name));
        sampler->draw(3, 0, whole.size(), whole.data());
        sampler->draw(3, 4096, part.size(), part.data());
        EXPECT_TRUE(std::equal(part.begin(), part.end(), whole.begin() + 4096)) << name;
    }
}

TEST(fading, counts_agree_with_the_exact_rates)
{
    const signal_set set = sample_sets::two_rings(4, 8, 2.1);
    unsigned seed = 40;
    for (const char* name : laws) {
        simulation_options options;
        options.channel = parse_law(name);
        options.es_n0 = from_db(14);
        options.wanted_errors = 0;
        options.max_symbols = 1'000'000;
        options.seed = ++seed;
        const predictor exact(set, options.channel);
        const tally counts = simulate(set, options).counts;
        const double n = static_cast<double>(counts.symbols), ser = exact.ser(options.es_n0);
        const double z =
            (static_cast<double>(counts.symbol_errors) - n * ser) / std::sqrt(n * ser * (1 - ser));
        std::printf("%-18s SER %.4e  z = %+.2f\n", name, ser, z);
        EXPECT_LT(std::abs(z), z_limit) << name;
    }
}

TEST(fading, thresholds_of_map_follow_the_gain)
{
    const signal_set set = sample_sets::with_shaped_priors(sample_sets::ring(4).translated(0.5), 2.0);
    simulation_options options;
    options.channel = parse_law("rayleigh");
    options.es_n0 = from_db(6);
    options.wanted_errors = 0;
    options.max_symbols = 1'000'000;
    const double ser = predictor(set, options.channel).ser(options.es_n0);
    const tally counts = simulate(set, options).counts;
    const double n = static_cast<double>(counts.symbols);
    const double z = (static_cast<double>(counts.symbol_errors) - n * ser) / std::sqrt(n * ser * (1 - ser));
    std::printf("map under rayleigh: SER %.4e  z = %+.2f\n", ser, z);
    EXPECT_LT(std::abs(z), z_limit);
}

TEST(fading, rare_errors_under_impulsive_noise)
{
    const signal_set set = sample_sets::two_rings(4, 8, 2.1);
    simulation_options options;
    options.channel = parse_law("impulsive:0.1:0.1");
    const predictor exact(set, options.channel);
    for (const double target : {1e-4, 1e-8, 1e-12}) {
        options.es_n0 = exact.es_n0_for_ser(target).value();
        const rare_simulation run = simulate_rare(set, options, 0.03);
        const double z = (run.ser.value - exact.ser(options.es_n0)) / run.ser.standard_error;
        std::printf("impulsive: SER %.3e  simulated %.3e  z = %+.2f\n", target, run.ser.value, z);
        EXPECT_LT(std::abs(z), z_limit);
    }
    options.channel = parse_law("rayleigh");
    EXPECT_THROW(simulate_rare(set, options), std::invalid_argument);
}

TEST(fading, refuses_map_under_impulsive_noise_and_unknown_laws)
{
    const signal_set set = sample_sets::with_shaped_priors(sample_sets::ring(4).translated(0.5), 2.0);
    simulation_options options;
    options.channel = parse_law("impulsive:0.1:0.1");
    EXPECT_THROW(simulate(set, options), std::invalid_argument);
    struct own final : law {
        std::string name() const override { return "own"; }
        double tail(double u) const override { return 1 / (1 + u); }
    };
    options.channel = std::make_shared<own>();
    options.rule = detector::ml;
    EXPECT_THROW(simulate(set, options), std::invalid_argument);
}
