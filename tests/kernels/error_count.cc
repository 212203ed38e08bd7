// SPDX-License-Identifier: GPL-3.0-or-later
// error_count against counting one by one.
#include "halfplane/kernels/error_count.h"

#include "halfplane/kernels/target.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <bitset>
#include <random>
#include <vector>

using namespace halfplane::kernels;

namespace {

template <typename Word>
void compare(std::size_t count, double error_rate, unsigned seed)
{
    std::mt19937_64 bits(seed);
    std::vector<Word> sent(count + 1), decided(count + 1);
    for (std::size_t k = 0; k < sent.size(); ++k) {
        sent[k] = static_cast<Word>(bits());
        decided[k] =
            static_cast<double>(bits() % 1000000) < error_rate * 1e6 ? static_cast<Word>(bits()) : sent[k];
    }
    if (error_rate == 1)
        for (std::size_t k = 0; k < sent.size(); ++k) // the largest sums that a lane can meet
            decided[k] = static_cast<Word>(~sent[k]);
    label_errors expected;
    std::vector<std::uint32_t> places;
    for (std::size_t k = 1; k < sent.size(); ++k) { // from 1: not aligned
        const auto wrong = static_cast<Word>(sent[k] ^ decided[k]);
        const std::uint64_t h = std::bitset<16>(wrong).count();
        ++expected.labels;
        expected.wrong_labels += wrong != 0;
        expected.wrong_bits += h;
        expected.wrong_bits_squared += h * h;
        for (std::size_t b = 0; b < 16; ++b)
            expected.by_bit[b] += wrong >> b & 1;
        if (wrong)
            places.push_back(static_cast<std::uint32_t>(k - 1));
    }
    for (const std::string& target : usable_targets()) {
        use_target(target);
        label_errors counted;
        count_label_errors(sent.data() + 1, decided.data() + 1, count, counted);
        EXPECT_EQ(counted.labels, expected.labels);
        EXPECT_EQ(counted.wrong_labels, expected.wrong_labels);
        EXPECT_EQ(counted.wrong_bits, expected.wrong_bits);
        EXPECT_EQ(counted.wrong_bits_squared, expected.wrong_bits_squared) << target << ' ' << count;
        EXPECT_EQ(counted.by_bit, expected.by_bit);
        if constexpr (sizeof(Word) == 2) {
            std::vector<std::uint32_t> where(count + 1);
            where.resize(find_errors(sent.data() + 1, decided.data() + 1, count, where.data()));
            EXPECT_EQ(where, places);
        }
    }
}

} // namespace

TEST(error_count, equals_counting_one_by_one)
{
    unsigned seed = 0;
    for (const std::size_t count : {0u, 1u, 7u, 31u, 32u, 33u, 1023u, 8160u, 8161u, 131071u})
        for (const double rate : {0.0, 1e-4, 0.3, 1.0}) {
            compare<std::uint16_t>(count, rate, ++seed);
            compare<std::uint8_t>(count, rate, ++seed);
        }
}

TEST(error_count, histogram_of_indices)
{
    std::mt19937_64 bits(1);
    for (const std::size_t size : {2u, 16u, 256u, 257u, 4096u})
        for (const std::size_t count : {0u, 1u, 7u, 255u, 1023u, 131071u}) {
            std::vector<std::uint16_t> index(count);
            std::vector<std::uint64_t> expected(size, 5), counted(size, 5);
            for (std::uint16_t& i : index) {
                i = static_cast<std::uint16_t>(bits() % size);
                ++expected[i];
            }
            count_indices(index.data(), count, counted.data(), size);
            EXPECT_EQ(counted, expected);
        }
}
