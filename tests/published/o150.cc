// SPDX-License-Identifier: GPL-3.0-or-later
// o150: period, runs and polarity as ITU-T O.150 has them, and the way back from bits to position.
#include "halfplane/pattern.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <map>

using halfplane::o150_sequences;
using halfplane::pattern;
using halfplane::register_locator;
using halfplane::shift_register;
using halfplane::signal_set;

namespace {

const signal_set one_bit({{-1, 0}, {1, 0}}, {0, 1}, 1);

/// Prime factors of 2^n − 1 (factorisations by trial division, checked below by multiplying up).
const std::map<unsigned, std::vector<std::uint64_t>> primes = {
    {9, {7, 73}},
    {11, {23, 89}},
    {15, {7, 31, 151}},
    {20, {3, 5, 5, 11, 31, 41}},
    {23, {47, 178481}},
    {29, {233, 1103, 2089}},
    {31, {2147483647}},
};

/// ITU-T O.150 (05/96) clause 5: "longest sequence of zeros" in the signal as sent; from memory.
const std::map<unsigned, unsigned> longest_zeros = {
    {9, 8}, {11, 10}, {15, 15}, {20, 19}, {23, 23}, {29, 29}, {31, 31}};

std::string name(unsigned stages)
{
    return "o150:" + std::to_string(stages);
}

} // namespace

TEST(O150, PolynomialsArePrimitive)
{
    // The register full of ones returns after 2^n − 1 steps and after no proper divisor of it.
    for (const auto& s : o150_sequences()) {
        shift_register r(s.stages, s.tap);
        const std::uint64_t full = r.content();
        std::uint64_t product = 1;
        for (std::uint64_t p : primes.at(s.stages)) {
            product *= p;
            r.seek(r.period() / p);
            EXPECT_NE(r.content(), full) << s.stages << " stages, divisor " << p;
        }
        EXPECT_EQ(product, r.period());
        r.seek(r.period());
        EXPECT_EQ(r.content(), full) << s.stages;
        EXPECT_EQ(pattern(name(s.stages), one_bit).period(), product);
    }
}

TEST(O150, OutputObeysTheRecurrenceAndTheStatedPolarity)
{
    for (const auto& s : o150_sequences()) {
        const pattern p(name(s.stages), one_bit);
        EXPECT_EQ(p.stages(), s.stages);
        std::vector<std::uint16_t> bits(5000);
        p.indices(123, bits.size(), bits.data());
        for (std::size_t k = s.stages; k < bits.size(); ++k)
            ASSERT_EQ(bits[k], bits[k - s.tap] ^ bits[k - s.stages] ^ (p.inverted() ? 1 : 0))
                << s.stages << " at " << k;
    }
}

TEST(O150, RunsOfOnePeriod)
{
    // A maximum-length sequence has 2^(n−2−L) runs of each kind and length L < n − 1, one of n − 1 zeros and
    // one of n ones (Golomb, Shift Register Sequences, 1967); inverting swaps the kinds. So the longest run
    // of zeros tells the polarity. Counted in full up to 23 stages.
    for (const auto& s : o150_sequences()) {
        if (s.stages > 23)
            continue;
        const pattern p(name(s.stages), one_bit);
        std::vector<std::uint16_t> bits(p.period());
        p.indices(0, bits.size(), bits.data());
        std::vector<std::uint64_t> runs[2] = {std::vector<std::uint64_t>(64), std::vector<std::uint64_t>(64)};
        std::size_t start = 0;
        while (bits[start] == bits[bits.size() - 1])
            ++start; // begin where a run begins, the period being a circle
        std::size_t length = 1;
        for (std::size_t k = 1; k <= bits.size(); ++k) {
            const auto now = bits[(start + k) % bits.size()], before = bits[(start + k - 1) % bits.size()];
            if (now == before && k < bits.size()) {
                ++length;
                continue;
            }
            ASSERT_LT(length, 64u);
            ++runs[before][length];
            length = 1;
        }
        const unsigned n = s.stages, zero = s.inverted ? 1 : 0;
        for (unsigned l = 1; l <= n - 2; ++l)
            for (const auto& kind : runs)
                EXPECT_EQ(kind[l], 1ull << (n - 2 - l)) << n << " stages, runs of " << l;
        EXPECT_EQ(runs[zero][n - 1], 1u);
        EXPECT_EQ(runs[zero][n], 0u);
        EXPECT_EQ(runs[1 - zero][n - 1], 0u);
        EXPECT_EQ(runs[1 - zero][n], 1u);

        unsigned zeros = 0;
        for (unsigned l = 1; l < 64; ++l)
            if (runs[0][l])
                zeros = l;
        EXPECT_EQ(zeros, longest_zeros.at(n)) << n << " stages";
    }
}

TEST(O150, LongestRunOfTheLongOnes)
{
    // Every content but zero occurs once a period (primitive, tested above), so the run of n ones stands at
    // bit 0 and nowhere else, and the run of n − 1 zeros where the content is 1: found by the logarithm, then
    // read out.
    for (unsigned stages : {29u, 31u}) {
        const pattern p(name(stages), one_bit);
        const std::uint16_t sent_one = p.inverted() ? 0 : 1;
        const auto run_at = [&](std::uint64_t position, std::uint16_t kind) {
            std::vector<std::uint16_t> bits(stages + 2);
            p.indices(position + p.period() - 1, bits.size(), bits.data());
            EXPECT_NE(bits[0], kind);
            std::size_t length = 0;
            while (length + 1 < bits.size() && bits[length + 1] == kind)
                ++length;
            return length;
        };
        EXPECT_EQ(run_at(0, sent_one), stages);
        const register_locator locator(p.stages(), p.tap());
        EXPECT_EQ(run_at(*locator.position(1), 1 - sent_one), stages - 1);
        EXPECT_EQ(sent_one == 0 ? stages : stages - 1, longest_zeros.at(stages));
    }
}

TEST(O150, JumpEqualsWalkAndLocatorFindsTheWayBack)
{
    for (const auto& s : o150_sequences()) {
        shift_register walk(s.stages, s.tap), jump(s.stages, s.tap);
        const register_locator locator(s.stages, s.tap);
        std::uint64_t position = 0;
        for (unsigned step = 1; step <= 200; ++step) {
            walk.take(step % 33);
            position += step % 33;
            jump.seek(position);
            ASSERT_EQ(jump.content(), walk.content()) << s.stages << " at " << position;
        }
        std::uint64_t k = 1;
        for (int i = 0; i < 50; ++i) {
            k = (k * 6364136223846793005ull + 1442695040888963407ull);
            jump.seek(k);
            EXPECT_EQ(locator.position(jump.content()).value(), k % jump.period()) << s.stages;
        }
        EXPECT_FALSE(locator.position(0).has_value());
    }
}

TEST(O150, ReaderFromABitOn)
{
    const signal_set set =
        signal_set::with_natural_labels({{0, 0}, {1, 0}, {2, 0}, {3, 0}, {0, 1}, {1, 1}, {2, 1}, {3, 1}});
    for (const auto& s : o150_sequences()) {
        const pattern one(name(s.stages), one_bit), three(name(s.stages), set);
        pattern::reader reader(three);
        for (std::uint64_t bit : {0ull, 1ull, 2ull, 500ull, 2047ull}) {
            std::vector<std::uint16_t> bits(30), symbols(10);
            one.indices(bit, bits.size(), bits.data());
            reader.seek_bit(bit);
            reader.next(symbols.size(), symbols.data());
            for (std::size_t k = 0; k < symbols.size(); ++k)
                EXPECT_EQ(symbols[k], bits[3 * k] << 2 | bits[3 * k + 1] << 1 | bits[3 * k + 2]);
        }
    }
}
