// SPDX-License-Identifier: GPL-3.0-or-later
// tally: counts by hand, sparse and dense transitions against a plain map, merging, the account.
#include "halfplane/tally.h"

#include <gtest/gtest.h>

#include <map>
#include <random>

using namespace halfplane;

namespace {

signal_set ring(std::size_t m)
{
    std::vector<complex> points;
    for (std::size_t k = 0; k < m; ++k)
        points.push_back(
            std::polar(1.0, 6.283185307179586 * static_cast<double>(k) / static_cast<double>(m)));
    return signal_set::with_natural_labels(std::move(points));
}

using indices = std::vector<std::uint16_t>;

} // namespace

TEST(Tally, CountsByHand)
{
    // Natural labels 00 01 10 11. Errors: 0→1 (01: right bit), 3→0 twice (11: both), 1→2 (11: both).
    const auto set = ring(4);
    tally t(set);
    const indices sent = {0, 1, 2, 3, 3, 0, 1, 2}, decided = {0, 1, 2, 0, 0, 1, 2, 2};
    t.count(sent.data(), decided.data(), sent.size());
    t.count_nonfinite();
    t.count_excluded(exclusion::slip);
    t.count_excluded(exclusion::overflow);
    t.count_excluded(exclusion::overflow);
    EXPECT_EQ(t.symbols, 8u);
    EXPECT_EQ(t.symbol_errors, 4u);
    EXPECT_EQ(t.bits, 16u);
    EXPECT_EQ(t.bit_errors, 7u);
    EXPECT_EQ(t.bit_errors_squared, 13u);
    EXPECT_EQ(t.by_bit, (std::vector<std::uint64_t>{3, 4}));
    EXPECT_EQ(t.sent, (std::vector<std::uint64_t>{2, 2, 2, 2}));
    EXPECT_EQ(t.excluded, (std::array<std::uint64_t, 4>{0, 1, 0, 2}));
    EXPECT_EQ(t.accounted(), 8u + 1 + 3);
    EXPECT_DOUBLE_EQ(t.bit_dispersion(), 13.0 / 7);
    EXPECT_EQ(t.transitions.count(3, 0), 2u);
    EXPECT_EQ(t.transitions.count(0, 3), 0u);
    EXPECT_DOUBLE_EQ(tally(set).bit_dispersion(), 1);
}

TEST(Tally, SparseAndDenseAgreeWithAPlainMapAndMerge)
{
    for (std::size_t m : {2u, 64u, 65u, 4096u}) {
        const auto set = ring(m);
        std::mt19937 random(7);
        tally whole(set), merged(set), part(set);
        std::map<std::pair<int, int>, std::uint64_t> plain;
        for (int k = 0; k < 200000; ++k) {
            const auto s = static_cast<std::uint16_t>(random() % m);
            // Mostly right, else anything: a few pairs often, many pairs once.
            const auto d = static_cast<std::uint16_t>(random() % 4   ? s
                                                      : random() % 2 ? (s + 1) % m
                                                                     : random() % m);
            whole.count(s, d);
            part.count(s, d);
            if (k % 7919 == 0) {
                merged.merge(part);
                part = tally(set);
            }
            if (s != d)
                ++plain[{s, d}];
        }
        merged.merge(part);
        for (const auto* t : {&whole, &merged}) {
            const auto listed = t->transitions.sorted();
            ASSERT_EQ(listed.size(), plain.size()) << m;
            auto expected = plain.begin();
            std::uint64_t errors = 0;
            for (const auto& x : listed) {
                EXPECT_EQ(std::make_pair(int{x.from}, int{x.to}), expected->first) << m;
                EXPECT_EQ(x.count, expected->second) << m;
                EXPECT_EQ(t->transitions.count(x.from, x.to), x.count);
                errors += x.count;
                ++expected;
            }
            EXPECT_EQ(errors, t->symbol_errors);
        }
        EXPECT_EQ(whole.by_bit, merged.by_bit);
        EXPECT_EQ(whole.sent, merged.sent);
        EXPECT_EQ(whole.bit_errors_squared, merged.bit_errors_squared);
        EXPECT_EQ(whole.accounted(), 200000u);
    }
}

/// In calls of every length: whole groups, rests, lanes that take turns, sets beyond them.
TEST(Tally, LongCallsEqualOneSymbolAtATime)
{
    std::mt19937_64 random(3);
    for (const std::size_t size : {std::size_t{2}, std::size_t{16}, std::size_t{256}, std::size_t{300}})
        for (const std::size_t n : {std::size_t{0},
                                    std::size_t{1},
                                    std::size_t{255},
                                    std::size_t{256},
                                    std::size_t{1023},
                                    std::size_t{5003}})
            for (const int wrong : {0, 1, 50, 100}) { // per cent
                const auto set = ring(size);
                indices sent(n), decided(n);
                for (std::size_t k = 0; k < n; ++k) {
                    sent[k] = static_cast<std::uint16_t>(random() % size);
                    decided[k] = static_cast<int>(random() % 100) < wrong
                                     ? static_cast<std::uint16_t>(random() % size)
                                     : sent[k];
                }
                tally at_once(set), one_by_one(set);
                at_once.count(sent.data(), decided.data(), n);
                for (std::size_t k = 0; k < n; ++k)
                    one_by_one.count(sent[k], decided[k]);
                EXPECT_EQ(at_once.symbols, n);
                EXPECT_EQ(at_once.symbol_errors, one_by_one.symbol_errors);
                EXPECT_EQ(at_once.bit_errors, one_by_one.bit_errors);
                EXPECT_EQ(at_once.bit_errors_squared, one_by_one.bit_errors_squared);
                EXPECT_EQ(at_once.sent, one_by_one.sent);
                EXPECT_EQ(at_once.by_bit, one_by_one.by_bit);
            }
}
