// SPDX-License-Identifier: GPL-3.0-or-later
// simulate: counts against the exact rates, and the same counts from one thread or many.
#include "halfplane/simulate.h"

#include "../kernels/sample_sets.h"
#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

using namespace halfplane;

namespace {

/// Two-sided normal quantile of 1 − 1e-6. All seeds are fixed; by chance a check would fail once in a million
/// seeds.
constexpr double z_limit = 4.8916;

void expect_same(const tally& a, const tally& b)
{
    EXPECT_EQ(a.symbols, b.symbols);
    EXPECT_EQ(a.symbol_errors, b.symbol_errors);
    EXPECT_EQ(a.bits, b.bits);
    EXPECT_EQ(a.bit_errors, b.bit_errors);
    EXPECT_EQ(a.bit_errors_squared, b.bit_errors_squared);
    EXPECT_EQ(a.nonfinite, b.nonfinite);
    EXPECT_EQ(a.sent, b.sent);
    EXPECT_EQ(a.by_bit, b.by_bit);
    const auto left = a.transitions.sorted(), right = b.transitions.sorted();
    ASSERT_EQ(left.size(), right.size());
    for (std::size_t k = 0; k < left.size(); ++k) {
        EXPECT_EQ(left[k].from, right[k].from);
        EXPECT_EQ(left[k].to, right[k].to);
        EXPECT_EQ(left[k].count, right[k].count);
    }
}

/// z of a count against its expectation; bit errors with the variance of their clumps.
void expect_rates(const tally& counts, double ser, double ber, const std::string& what)
{
    const auto n = static_cast<double>(counts.symbols);
    const double z_symbol =
        (static_cast<double>(counts.symbol_errors) - n * ser) / std::sqrt(n * ser * (1 - ser));
    const double b = static_cast<double>(counts.bits) / n;
    const double second = static_cast<double>(counts.bit_errors_squared) / n;
    const double mean = b * ber;
    const double z_bit =
        (static_cast<double>(counts.bit_errors) - n * mean) / std::sqrt(n * (second - mean * mean));
    std::printf("%-44s SER %.4e  z = %+.2f   BER %.4e  z = %+.2f\n", what.c_str(), ser, z_symbol, ber, z_bit);
    EXPECT_LT(std::abs(z_symbol), z_limit) << what;
    EXPECT_LT(std::abs(z_bit), z_limit) << what;
}

std::vector<signal_set> some_sets()
{
    using namespace sample_sets;
    return {ring(2), ring(8), two_rings(4, 8, 2.1), grid(4, 4), random(33, 2), grid(16, 16)};
}

} // namespace

TEST(simulate, counts_agree_with_the_exact_rates)
{
    unsigned seed = 0;
    for (const signal_set& set : some_sets()) {
        const predictor exact(set);
        for (const double ser : {0.3, 1e-2, 1e-4}) {
            simulation_options options;
            options.es_n0 = exact.es_n0_for_ser(ser).value();
            options.wanted_errors = 0;
            options.max_symbols = 3'000'000;
            options.seed = ++seed;
            const simulation run = simulate(set, options);
            EXPECT_EQ(run.counts.symbols, options.max_symbols);
            EXPECT_FALSE(run.cancelled);
            expect_rates(run.counts, exact.ser(options.es_n0), exact.ber(options.es_n0), set.name());
        }
    }
}

TEST(simulate, each_transition_agrees_with_the_exact_one)
{
    const signal_set set = sample_sets::two_rings(4, 8, 2.1);
    const predictor exact(set);
    simulation_options options;
    options.es_n0 = exact.es_n0_for_ser(0.05).value();
    options.wanted_errors = 0;
    options.max_symbols = 5'000'000;
    const tally counts = simulate(set, options).counts;
    double worst = 0;
    for (std::size_t i = 0; i < set.size(); ++i) {
        const std::vector<double> row = exact.transition_row(options.es_n0, i);
        const auto sent = static_cast<double>(counts.sent[i]);
        worst = std::max(worst, std::abs(sent - 5e6 / 12) / std::sqrt(5e6 / 12));
        for (std::size_t j = 0; j < set.size(); ++j)
            if (j != i && sent * row[j] > 10) { // else not near enough to a normal deviate
                const auto counted = static_cast<double>(
                    counts.transitions.count(static_cast<std::uint16_t>(i), static_cast<std::uint16_t>(j)));
                worst = std::max(worst, std::abs(counted - sent * row[j]) / std::sqrt(sent * row[j]));
            }
    }
    std::printf("worst |z| of 12 points and their transitions: %.2f\n", worst);
    EXPECT_LT(worst, z_limit + 0.5); // the largest of about a hundred
}

TEST(simulate, one_thread_or_many_count_the_same)
{
    const signal_set set = sample_sets::with_shaped_priors(sample_sets::grid(4, 4), 0.5);
    simulation_options options;
    options.es_n0 = 20;
    options.wanted_errors = 20000;
    options.seed = 77;
    options.threads = 1;
    const simulation one = simulate(set, options);
    EXPECT_GE(one.counts.symbol_errors, options.wanted_errors);
    for (const unsigned threads : {2u, 3u, 7u}) {
        options.threads = threads;
        expect_same(simulate(set, options).counts, one.counts);
    }
    options.seed = 78;
    EXPECT_NE(simulate(set, options).counts.symbol_errors, one.counts.symbol_errors);
}

TEST(simulate, stops_where_told)
{
    const signal_set set = sample_sets::grid(4, 4);
    simulation_options options;
    options.es_n0 = from_db(13);
    for (const std::uint64_t symbols : {1ull, 7ull, 65535ull, 65536ull, 65537ull, 200001ull}) {
        options.wanted_errors = 0;
        options.max_symbols = symbols;
        const tally counts = simulate(set, options).counts;
        EXPECT_EQ(counts.symbols, symbols);
        EXPECT_EQ(counts.accounted(), symbols);
    }
    options.max_symbols = 100'000'000;
    options.relative_width = 0.05;
    const tally counts = simulate(set, options).counts;
    const auto errors = static_cast<double>(counts.symbol_errors);
    // The 95 % interval of k errors is about 2·1.96/√k of the rate wide: 0.05 needs k ≈ 6150.
    EXPECT_GT(errors, 5500);
    EXPECT_LT(errors, 6150 + 3 * 65536 * 0.1);
}

TEST(simulate, cancelling_keeps_what_was_counted)
{
    simulation_options options;
    options.es_n0 = from_db(30);
    options.wanted_errors = 0;
    options.max_symbols = std::uint64_t{1} << 50;
    double last = -1;
    const simulation run = simulate(sample_sets::grid(4, 4), options, [&](const simulation_progress& p) {
        EXPECT_GE(p.fraction, last);
        last = p.fraction;
        return p.counts.symbols < 1'000'000;
    });
    EXPECT_TRUE(run.cancelled);
    EXPECT_GE(run.counts.symbols, 1'000'000u);
    EXPECT_EQ(run.counts.accounted(), run.counts.symbols);
}

TEST(simulate, unequal_priors_under_both_rules)
{
    const signal_set set = sample_sets::with_shaped_priors(sample_sets::two_rings(4, 8, 2.1), 1.0);
    for (const detector rule : {detector::map, detector::ml}) {
        simulation_options options;
        options.es_n0 = from_db(9);
        options.rule = rule;
        options.wanted_errors = 0;
        options.max_symbols = 3'000'000;
        const predictor exact(set, std::make_shared<awgn>(), rule);
        expect_rates(simulate(set, options).counts,
                     exact.ser(options.es_n0),
                     exact.ber(options.es_n0),
                     rule == detector::map ? "map" : "ml");
    }
}

TEST(simulate, displaced_points_err_as_a_shifted_pair_does)
{
    // Two points ±1 whose means are turned by φ and moved by o: errors with Q((cos φ ± o)/σ), σ² = N0/2.
    const signal_set set = sample_sets::ring(2);
    displacement moved;
    moved.rotation = 0.4;
    moved.offset = {0.15, 0.7};
    simulation_options options;
    options.es_n0 = from_db(5);
    options.means = moved.means(set);
    options.wanted_errors = 0;
    options.max_symbols = 4'000'000;
    const double sigma = std::sqrt(1 / options.es_n0 / 2);
    const auto q = [](double x) { return std::erfc(x / std::sqrt(2.0)) / 2; };
    const double rate = (q((std::cos(0.4) + 0.15) / sigma) + q((std::cos(0.4) - 0.15) / sigma)) / 2;
    expect_rates(simulate(set, options).counts, rate, rate, "turned and moved pair");
}

TEST(simulate, displacement_moves_points_as_defined)
{
    const signal_set set = sample_sets::grid(2, 2); // ±1 ± 1i
    displacement d;
    d.saturation = 1;
    d.compression_smoothness = 1;
    for (const complex m : d.means(set)) // √2/√(1 + 2)
        EXPECT_NEAR(std::abs(m), std::sqrt(2.0 / 3), 1e-15);
    d = {};
    d.gain_imbalance_db = 2;
    complex m = d.means(set)[3];
    EXPECT_NEAR(m.real() / m.imag(), std::pow(10.0, 0.1), 1e-15);
    EXPECT_NEAR(m.real() * m.imag(), 1, 1e-15);
    d = {};
    d.phase_imbalance = 0.1; // the axes' images stand at π/2 − 0.1
    const std::vector<complex> moved = d.means(set);
    const complex i_axis = moved[3] + moved[1], q_axis = moved[3] + moved[2];
    EXPECT_NEAR(std::abs(std::arg(q_axis / i_axis)), M_PI / 2 - 0.1, 1e-14);
    d.saturation = -1;
    EXPECT_THROW(d.means(set), std::invalid_argument);
    d = {};
    d.rotation = std::nan("");
    EXPECT_THROW(d.means(set), std::invalid_argument);
}

TEST(simulate, refuses_what_makes_no_sense)
{
    const signal_set set = sample_sets::ring(4);
    const auto refused = [&](const char* word, const std::function<void(simulation_options&)>& spoil) {
        simulation_options options;
        spoil(options);
        try {
            simulate(set, options);
            ADD_FAILURE() << word << " was accepted";
        } catch (const std::invalid_argument& e) {
            EXPECT_NE(std::string(e.what()).find(word), std::string::npos) << e.what();
        }
    };
    for (const double bad : {0.0, -1.0, std::nan(""), std::numeric_limits<double>::infinity()})
        refused("es_n0", [&](simulation_options& o) { o.es_n0 = bad; });
    refused("max_symbols", [](simulation_options& o) { o.max_symbols = 0; });
    refused("relative_width", [](simulation_options& o) { o.relative_width = -1; });
    refused("channel", [](simulation_options& o) { o.channel = nullptr; });
    refused("means", [](simulation_options& o) { o.means.resize(3); });
    refused("means[2]", [](simulation_options& o) {
        o.means.assign(4, std::nan(""));
        o.means[0] = o.means[1] = 1;
    });
}
