// SPDX-License-Identifier: GPL-3.0-or-later
// llr_decider against the formula in double precision, on every instruction set that this machine has.
#include "halfplane/kernels/llr.h"

#include "halfplane/kernels/target.h"
#include "sample_sets.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <random>

using namespace halfplane;
using namespace halfplane::kernels;
using sample = std::complex<float>;

namespace {

std::vector<sample> noisy(const signal_set& set, double n0, std::size_t count, unsigned seed)
{
    std::mt19937_64 bits(seed);
    std::normal_distribution<double> normal(0, std::sqrt(n0 / 2));
    std::vector<sample> in(count);
    for (sample& r : in) {
        complex z = set.points()[bits() % set.size()] + complex(normal(bits), normal(bits));
        if (bits() % 8 == 0) // between two points, where a ratio passes through zero
            z = (set.points()[bits() % set.size()] + set.points()[bits() % set.size()]) / 2.0;
        else if (bits() % 16 == 0)
            z *= 3.0;
        r = {static_cast<float>(z.real()), static_cast<float>(z.imag())};
    }
    return in;
}

std::vector<double> by_formula(const llr_decider& decider, const std::vector<sample>& in)
{
    std::vector<double> ratios(in.size() * decider.label_bits());
    decider.decide_reference(in.data(), ratios.data(), in.size());
    return ratios;
}

/// Largest error over max(1, |reference|).
double
worst_error(const llr_decider& decider, const std::vector<sample>& in, const std::vector<double>& expected)
{
    std::vector<float> out(expected.size());
    decider.decide(in.data(), out.data(), in.size());
    double worst = 0;
    for (std::size_t k = 0; k < out.size(); ++k) {
        const double error = std::abs(out[k] - expected[k]) / std::max(1.0, std::abs(expected[k]));
        worst = error <= worst ? worst : error; // a NaN is kept
    }
    return worst;
}

std::vector<signal_set> sets()
{
    using namespace sample_sets;
    std::vector<label_t> shuffled(16);
    for (std::size_t i = 0; i < 16; ++i)
        shuffled[i] = static_cast<label_t>(i * 7 % 16);
    const signal_set sparse( // three bits for four points, the middle one always 1
        {{1, 1}, {-1, 1}, {-1, -1}, {1, -1}},
        {2, 3, 6, 7},
        3,
        {},
        "sparse labels");
    return {ring(2),
            ring(8),
            two_rings(4, 8, 2.1),
            grid(4, 4),
            grid(4, 4).relabelled(shuffled),
            random(33, 2),
            grid(8, 8),
            grid(16, 16),
            sparse,
            with_shaped_priors(grid(4, 4), 1.0),
            with_shaped_priors(random(33, 2), 50.0),
            with_shaped_priors(grid(4, 4), 90.0)};
}

} // namespace

TEST(llr, follows_the_formula_from_minus_10_to_40_db)
{
    double worst = 0;
    unsigned seed = 0;
    for (const signal_set& set : sets())
        for (const llr_rule rule : {llr_rule::exact, llr_rule::max_log})
            for (int db = -10; db <= 40; db += 5) {
                const double n0 = set.es() / std::pow(10.0, db / 10.0);
                const llr_decider decider(set, n0, {rule, llr_sign::positive_is_0, 1e6f});
                const std::vector<sample> in = noisy(set, n0, 20000 / set.size(), ++seed);
                const std::vector<double> expected = by_formula(decider, in);
                for (const std::string& target : usable_targets()) {
                    use_target(target);
                    const double error = worst_error(decider, in, expected);
                    EXPECT_LT(error, llr_decider::accuracy)
                        << set.name() << " at " << db << " dB on " << target;
                    worst = error <= worst ? worst : error;
                }
            }
    std::printf("worst error, absolute or relative: %.2e\n", worst);
}

TEST(llr, a_pair_has_the_textbook_ratio)
{
    // Two points ±1 with labels 0 and 1: L = 4·Re(r)/N0.
    const signal_set set({{1, 0}, {-1, 0}}, {0, 1}, 1);
    const std::vector<sample> in{{0.5f, 3.0f}, {-0.25f, 0.0f}, {0.0f, 1.0f}, {1e-6f, 0.0f}, {100.0f, 0.0f}};
    std::vector<float> out(in.size());
    for (const llr_rule rule : {llr_rule::exact, llr_rule::max_log})
        for (const llr_sign sign : {llr_sign::positive_is_0, llr_sign::positive_is_1}) {
            llr_decider decider(set, 0.5, {rule, sign, 1e6f});
            const float flip = sign == llr_sign::positive_is_0 ? 1 : -1;
            for (const double n0 : {0.5, 0.02}) {
                decider.set_n0(n0);
                decider.decide(in.data(), out.data(), in.size());
                for (std::size_t k = 0; k < in.size(); ++k)
                    EXPECT_NEAR(out[k], flip * 4 * in[k].real() / n0, 1e-5 * (1 + std::abs(out[k])));
            }
        }
}

TEST(llr, saturates_where_told_and_is_silent_on_broken_samples)
{
    const signal_set set = sets()[8];
    constexpr float inf = std::numeric_limits<float>::infinity(), huge = 3e38f;
    const std::vector<sample> in{
        {1, 1}, {std::nanf(""), 0}, {0, inf}, {huge, -huge}, {-huge, 1e-40f}, {0, 0}};
    for (const llr_rule rule : {llr_rule::exact, llr_rule::max_log}) {
        const llr_decider decider(set, 1e-3, {rule, llr_sign::positive_is_0, 20.0f});
        std::vector<float> out(in.size() * 3);
        decider.decide(in.data(), out.data(), in.size());
        for (std::size_t k = 0; k < in.size(); ++k)
            for (std::size_t b = 0; b < 3; ++b) {
                const float l = out[3 * k + b];
                EXPECT_LE(std::abs(l), 20.0f);
                if (k == 1 || k == 2) {
                    EXPECT_EQ(l, 0.0f);
                } else if (b == 1) {
                    EXPECT_EQ(l, -20.0f); // the middle bit is 1 in every label
                }
            }
        EXPECT_EQ(out[0], 20.0f); // sample 1+1i: label 010
        EXPECT_EQ(out[2], 20.0f);
        EXPECT_EQ(out[3 * 3 + 0], -20.0f); // towards (1, −1): label 111
        EXPECT_EQ(out[3 * 3 + 2], -20.0f);
    }
}

TEST(llr, awkward_lengths_and_unaligned_arrays)
{
    const signal_set set = sample_sets::two_rings(4, 8, 2.1);
    const llr_decider decider(set, 0.3);
    const std::vector<sample> in = noisy(set, 0.3, 131071 + 3, 9);
    std::vector<float> whole(in.size() * 4);
    decider.decide(in.data(), whole.data(), in.size());
    for (const std::size_t count : {0u, 1u, 7u, 15u, 17u, 1023u, 131071u})
        for (const std::size_t shift : {0u, 1u, 3u}) {
            std::vector<float> out(count * 4 + shift + 1, 99.0f);
            decider.decide(in.data() + shift, out.data() + shift, count);
            EXPECT_TRUE(std::equal(out.begin() + static_cast<long>(shift),
                                   out.end() - 1,
                                   whole.begin() + static_cast<long>(4 * shift)));
            EXPECT_EQ(out.back(), 99.0f);
        }
}

TEST(llr, refuses_what_makes_no_sense)
{
    const signal_set set = sample_sets::ring(4);
    for (const double bad : {0.0, -1.0, std::nan(""), std::numeric_limits<double>::infinity()}) {
        EXPECT_THROW(llr_decider(set, bad), std::invalid_argument);
        llr_decider good(set, 1.0);
        EXPECT_THROW(good.set_n0(bad), std::invalid_argument);
        EXPECT_EQ(good.n0(), 1.0);
    }
    for (const float bad : {0.0f, -1.0f, 1e7f, std::nanf("")})
        EXPECT_THROW(llr_decider(set, 1.0, {llr_rule::exact, llr_sign::positive_is_0, bad}),
                     std::invalid_argument);
}
