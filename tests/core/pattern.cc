// SPDX-License-Identifier: GPL-3.0-or-later
// pattern: draws against vectors from an independent implementation, files, and every refusal with its
// message.
#include "halfplane/pattern.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <fstream>
#include <random>

using halfplane::complex;
using halfplane::pattern;
using halfplane::signal_set;

namespace {

signal_set ring(std::size_t m)
{
    std::vector<complex> points(m);
    for (std::size_t k = 0; k < m; ++k)
        points[k] = std::polar(1.0, 2 * M_PI * static_cast<double>(k) / static_cast<double>(m));
    return signal_set::with_natural_labels(points);
}

std::vector<std::uint16_t> first(const pattern& p, std::size_t count, std::uint64_t from = 0)
{
    std::vector<std::uint16_t> out(count);
    p.indices(from, count, out.data());
    return out;
}

std::string refusal(const std::string& text, const signal_set& set)
{
    try {
        pattern(text, set);
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

/// A file that lives as long as the test.
class text_file
{
public:
    explicit text_file(const std::string& content)
        : d_path(testing::TempDir() + "pattern_" + std::to_string(std::random_device{}()) + ".txt")
    {
        std::ofstream(d_path) << content;
    }
    ~text_file() { std::remove(d_path.c_str()); }
    std::string path() const { return d_path; }
    std::string text() const { return "file:" + d_path; }

private:
    std::string d_path;
};

using indices = std::vector<std::uint16_t>;

} // namespace

// The vectors come from Python integers and fractions:
//   z = (s := (s + 0x9E3779B97F4A7C15) % 2**64); z = (z ^ z >> 30) * 0xBF58476D1CE4E5B9 % 2**64;
//   z = (z ^ z >> 27) * 0x94D049BB133111EB % 2**64; u = (z ^ z >> 31) >> 32; next(i for i, c in enumerate(C)
//   if u < c)
// with C_i = floor(2**32 * sum(Fraction(p) for p in priors[:i + 1])).
TEST(Pattern, DrawsAgreeWithAnIndependentImplementation)
{
    EXPECT_EQ(first(pattern("draw:1", ring(12)), 24),
              (indices{6, 8, 11, 5, 5, 9, 10, 6, 3, 9, 4, 7, 5, 6, 5, 2, 7, 9, 8, 10, 0, 0, 5, 1}));
    EXPECT_EQ(first(pattern("draw:18446744073709551615:24", ring(7)), 24),
              (indices{6, 6, 1, 2, 4, 5, 6, 1, 5, 0, 0, 5, 0, 6, 1, 4, 2, 1, 0, 2, 2, 4, 3, 1}));
    EXPECT_EQ(first(pattern("draw:42", ring(4).with_priors({0.5, 0.25, 0.125, 0.125})), 24),
              (indices{1, 0, 0, 0, 0, 2, 0, 2, 0, 1, 0, 0, 1, 1, 1, 0, 0, 0, 0, 1, 3, 0, 1, 1}));
    // Σ (k + 1)·index over the default period.
    const auto weighted = [](const indices& values) {
        std::uint64_t sum = 0;
        for (std::size_t k = 0; k < values.size(); ++k)
            sum += (k + 1) * values[k];
        return sum;
    };
    EXPECT_EQ(weighted(first(pattern("draw:1", ring(12)), 4096)), 45115989u);
    EXPECT_EQ(weighted(first(pattern("draw:7", ring(4096)), 4096)), 17118346032u);
}

TEST(Pattern, PeriodRepeatsAndAnyPositionIsReached)
{
    const auto set = ring(16);
    for (const std::string text : {"draw:3:100", "o150:9", "o150:20", "o150:31"}) {
        const pattern p(text, set);
        EXPECT_EQ(first(p, 50), first(p, 50, p.period())) << text;
        const auto long_run = first(p, 300, p.period() - 100);
        for (std::size_t k : {1u, 99u, 100u, 101u, 250u})
            EXPECT_EQ(long_run[k], first(p, 1, p.period() - 100 + k)[0]) << text << " at " << k;
    }
    EXPECT_EQ(pattern("draw:3", set).period(), 4096u);
    EXPECT_EQ(pattern("o150:9", set).period(), 511u);
    // 2^20 − 1 = 3·5²·11·31·41 shares a factor with labels of 3 bits: three bits a symbol, a third of the
    // period.
    EXPECT_EQ(pattern("o150:20", ring(8)).period(), ((1u << 20) - 1) / 3);
}

TEST(Pattern, BitsFillLabelsLeftmostFirst)
{
    // Labels are reversed against the index, so that the two cannot be mistaken for each other.
    const signal_set set({{0, 0}, {1, 0}, {2, 0}, {3, 0}}, {3, 2, 1, 0}, 2);
    const text_file even("0001\n1011\n");
    EXPECT_EQ(first(pattern(even.text(), set), 4), (indices{3, 2, 1, 0}));
    // Seven bits in labels of two: seven symbols until both repeat together.
    const text_file odd("1101000");
    const pattern p(odd.text(), set);
    EXPECT_EQ(p.period(), 7u);
    EXPECT_EQ(first(p, 8), (indices{0, 2, 3, 2, 1, 1, 3, 0})); // 11 01 00 01 10 10 00 | 11
    EXPECT_TRUE(p.carries_bits());
}

TEST(Pattern, FilesOfIndices)
{
    const text_file file("0 11 3\n\n 7 \n");
    const pattern p(file.text(), ring(12));
    EXPECT_EQ(p.type(), pattern::kind::file);
    EXPECT_FALSE(p.carries_bits());
    EXPECT_EQ(p.period(), 4u);
    EXPECT_EQ(first(p, 6, 4'000'000'001), (indices{11, 3, 7, 0, 11, 3}));
}

TEST(Pattern, EveryRefusalNamesWhatAndWhere)
{
    const auto set = ring(12);
    EXPECT_EQ(refusal("o151:9", set), "pattern 'o151:9': known are o150:N, draw:SEED[:PERIOD] and file:PATH");
    EXPECT_EQ(
        refusal("o150:10", ring(4)),
        "pattern 'o150:10': ITU-T O.150 sequences here have 9, 11, 15, 20, 23, 29 or 31 stages, got '10'");
    EXPECT_EQ(
        refusal("o150:9", set),
        "pattern 'o150:9': bits need a point for every label; this set has 12 points for 16 labels of 4 bits "
        "(use draw or a file of indices)");
    EXPECT_EQ(refusal("draw:", set),
              "pattern 'draw:': the seed must be a whole number from 0 to 18446744073709551615, got ''");
    EXPECT_EQ(refusal("draw:18446744073709551616", set),
              "pattern 'draw:18446744073709551616': the seed must be a whole number from 0 to "
              "18446744073709551615, got '18446744073709551616'");
    EXPECT_EQ(refusal("draw:-1", set),
              "pattern 'draw:-1': the seed must be a whole number from 0 to 18446744073709551615, got '-1'");
    EXPECT_EQ(refusal("draw:1:0", set),
              "pattern 'draw:1:0': the period must be a whole number from 1 to 16777216, got '0'");
    EXPECT_EQ(
        refusal("draw:1:16777217", set),
        "pattern 'draw:1:16777217': the period must be a whole number from 1 to 16777216, got '16777217'");
    EXPECT_EQ(refusal("file:/nowhere/at/all", set), "cannot open pattern file '/nowhere/at/all'");
    EXPECT_EQ(refusal("file:", set), "cannot open pattern file ''");

    const text_file empty(" \n\n");
    EXPECT_EQ(refusal(empty.text(), set), "pattern file '" + empty.path() + "' holds no bits and no indices");
    const text_file beyond("3 4\n5 12\n");
    EXPECT_EQ(refusal(beyond.text(), set),
              beyond.path() + ", line 2: index 12 is not in the set of 12 points, 0 to 11");
    const text_file word("3 4\n5 -1\n");
    EXPECT_EQ(refusal(word.text(), set), word.path() + ", line 2: '-1' is neither an index nor bits");
    const text_file grouped("0101 0011\n");
    EXPECT_EQ(refusal(grouped.text(), set),
              grouped.path() + ", line 1: index '0101' has a leading zero (bits are written without spaces)");
    const text_file bits("0101\n0011\n");
    EXPECT_EQ(refusal(bits.text(), set),
              "pattern file '" + bits.path() +
                  "' holds bits, and bits need a point for every label; this set has 12 points for 16 labels "
                  "(write indices instead)");
}
