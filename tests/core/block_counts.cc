// SPDX-License-Identifier: GPL-3.0-or-later
// block_counts: independent errors raise no alarm, bursts of any length do, and the factor is what theory
// gives.
#include "halfplane/block_counts.h"

#include <gtest/gtest.h>

#include <cmath>
#include <iostream>
#include <random>
#include <vector>

using halfplane::block_counts;

namespace {

/// `n` symbols, bursts of `length` consecutive errors that start with probability `start` at each symbol
/// outside a burst.
block_counts counted(std::size_t n, double start, int length, unsigned seed)
{
    std::mt19937_64 random(seed);
    std::geometric_distribution<std::size_t> gap(start);
    std::vector<std::uint16_t> sent(n, 0), decided(n, 0);
    for (std::size_t k = gap(random); k < n; k += gap(random) + static_cast<std::size_t>(length))
        for (std::size_t j = k; j < n && j < k + static_cast<std::size_t>(length); ++j)
            decided[j] = 1;
    block_counts blocks;
    for (std::size_t k = 0; k < n; k += 1000) // pieces that fit no block
        blocks.add(&sent[k], &decided[k], std::min<std::size_t>(1000, n - k));
    return blocks;
}

} // namespace

TEST(BlockCounts, IndependentErrorsRaiseNoAlarm)
{
    // 4,000 runs in all at the stated significance of 0.001: more than 13 alarms have a probability of 5e-5
    // (Poisson of mean 4).
    int alarms = 0, runs = 0;
    for (double rate : {0.001, 0.01, 0.1, 0.4}) {
        int here = 0;
        for (unsigned seed = 0; seed < 1000; ++seed, ++runs)
            here += counted(50000, rate, 1, seed).dispersion().value_or(1) > 1;
        std::cout << "rate " << rate << ": " << here << " alarms of 1000\n";
        alarms += here;
    }
    EXPECT_LE(alarms, 13) << "of " << runs;
}

TEST(BlockCounts, BurstsAreFoundWithTheirDispersion)
{
    // Blocks far longer than a burst of L see a compound Poisson count of dispersion L; gaps of mean 1/p
    // between bursts take part of that away: renewal theory gives (1 − f)²·L for a fraction f of symbols in
    // bursts, over 1 − f for the binomial reference.
    for (int length : {5, 20, 200}) {
        const double start = 0.02 / length;
        const double f = start * length / (start * length + 1);
        double sum = 0;
        for (unsigned seed = 0; seed < 40; ++seed) {
            const auto d = counted(1000000, start, length, 100 + seed).dispersion();
            ASSERT_TRUE(d && *d > 1) << length << ' ' << seed;
            sum += *d / 40;
        }
        std::cout << "bursts of " << length << ": mean dispersion " << sum << ", theory " << (1 - f) * length
                  << '\n';
        EXPECT_GT(sum, 0.85 * (1 - f) * length);
        EXPECT_LT(sum,
                  1.9 * (1 - f) *
                      length); // the largest over block lengths: high by the scatter of the longest
    }
}

TEST(BlockCounts, OpenBelowTwentyErrorsOrSixteenBlocks)
{
    std::vector<std::uint16_t> sent(100000, 0), decided(100000, 0);
    block_counts few;
    for (int k = 0; k < 19; ++k)
        decided[5000 + 100 * static_cast<std::size_t>(k)] = 1;
    few.add(sent.data(), decided.data(), sent.size());
    EXPECT_FALSE(few.dispersion());
    decided[0] = 1;
    block_counts enough;
    enough.add(sent.data(), decided.data(), sent.size());
    EXPECT_TRUE(enough.dispersion());

    std::fill(decided.begin(), decided.end(), 1);
    block_counts fifteen, sixteen;
    fifteen.add(sent.data(), decided.data(), 15 * block_counts::shortest + 63);
    sixteen.add(sent.data(), decided.data(), 16 * block_counts::shortest);
    EXPECT_FALSE(fifteen.dispersion());
    EXPECT_EQ(sixteen.dispersion(), 1) << "all in error: no block differs from another";
}

TEST(BlockCounts, StepsInRunsEqualSymbolsOneByOne)
{
    std::mt19937_64 random(8);
    block_counts runs, symbols;
    for (int k = 0; k < 400; ++k) {
        const auto clear = random() % (k % 10 == 0 ? 40000 : 90);
        const std::vector<std::uint16_t> sent(clear + 1, 0);
        auto decided = sent;
        decided.back() = 1;
        symbols.add(sent.data(), decided.data(), sent.size());
        runs.add_clear(clear);
        runs.add_error();
        ASSERT_EQ(runs.dispersion(), symbols.dispersion()) << k;
    }
    EXPECT_GT(*runs.dispersion(), 1); // long gaps among short ones: the comparison is of something
}
