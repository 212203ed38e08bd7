// SPDX-License-Identifier: GPL-3.0-or-later
// second_counts: rows of seconds worked by hand, and the ten-second rule against a count made with the whole
// run in view.
#include "halfplane/second_counts.h"

#include <gtest/gtest.h>

#include <random>
#include <string>
#include <vector>

using halfplane::second;
using halfplane::second_counts;

namespace {

/// '.' clean, 'e' errored, 'S' severely errored, 'x' unmeasured.
second_counts counted(const std::string& run)
{
    second_counts c;
    for (const char kind : run) {
        second s;
        s.bits = 10000;
        s.bit_errors = kind == 'e' ? 9 : kind == 'S' ? 10 : 0; // BER 1e-3 is severe
        s.unmeasured = kind == 'x';
        c.add(s);
    }
    return c;
}

struct expected {
    std::uint64_t errored, severe, available, unavailable;
};

void expect_counts(const std::string& run, const expected& e)
{
    const auto c = counted(run);
    EXPECT_EQ(c.errored(), e.errored) << run;
    EXPECT_EQ(c.severely_errored(), e.severe) << run;
    EXPECT_EQ(c.available(), e.available) << run;
    EXPECT_EQ(c.unavailable(), e.unavailable) << run;
    EXPECT_EQ(c.all(), run.size()) << run;
}

/// The rule read over the whole run: a change of state takes effect at the first second of the row of ten
/// that proves it.
expected with_hindsight(const std::string& run)
{
    expected e{};
    bool available = true;
    for (std::size_t k = 0; k < run.size(); ++k) {
        std::size_t same = 0;
        while (k + same < run.size() && same < 10 && (run[k + same] == 'S') == available)
            ++same;
        if (same == 10)
            available = !available;
        (available ? e.available : e.unavailable) += 1;
        e.errored += available && run[k] != '.';
        e.severe += available && run[k] == 'S';
    }
    return e;
}

} // namespace

TEST(SecondCounts, ByHand)
{
    expect_counts("", {0, 0, 0, 0});
    expect_counts("..e.S.", {2, 1, 6, 0});
    expect_counts("SSSSSSSSS", {9, 9, 9, 0});              // nine are not yet ten
    expect_counts("eSSSSSSSSSS", {1, 0, 1, 10});           // ten are, from the first
    expect_counts("SSSSSSSSS.S", {10, 10, 11, 0});         // a row that broke
    expect_counts("SSSSSSSSSS.........", {0, 0, 0, 19});   // nine good ones do not end it
    expect_counts("SSSSSSSSSS..e.e.....", {2, 0, 10, 10}); // ten do, from the first, errored ones among them
    expect_counts("SSSSSSSSSS.....S..........", {0, 0, 10, 16});
    expect_counts("SSSSSxSSSSS", {0, 0, 0, 10}); // unmeasured ones neither lengthen nor break
}

TEST(SecondCounts, AgreesWithHindsight)
{
    std::mt19937 random(1);
    int turns = 0;
    for (int k = 0; k < 500; ++k) {
        std::string run;
        while (run.size() < 200) // rows of random length, so that both states occur
            run.append(1 + random() % 14, ".eS"[random() % 3]);
        const auto e = with_hindsight(run);
        turns += e.available > 0 && e.unavailable > 0;
        expect_counts(run, e);
    }
    EXPECT_GT(turns, 100);
}

TEST(SecondCounts, LossIsSevereDamageIsNot)
{
    second_counts c;
    second lost, damaged;
    lost.lost = true;
    damaged.bits = 10;
    damaged.damaged = true;
    c.add(lost);
    c.add(damaged);
    EXPECT_EQ(c.errored(), 2u);
    EXPECT_EQ(c.severely_errored(), 1u);
}
