// SPDX-License-Identifier: GPL-3.0-or-later
// recent_samples: the latest finite ones that were judged or are live, in order, however they come in.
#include "halfplane/link/recent_samples.h"

#include "halfplane/link/watch.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <limits>

using namespace halfplane;
using link::recent_samples;

namespace {

/// Samples numbered by their real part; every third is excluded, every seventh live, every eleventh no
/// number.
struct numbered {
    std::vector<std::complex<float>> samples;
    std::vector<reference_t> reference;
    explicit numbered(int n)
    {
        for (int k = 0; k < n; ++k) {
            samples.emplace_back(static_cast<float>(k),
                                 k % 11 == 0 ? std::numeric_limits<float>::quiet_NaN() : 0.0F);
            reference.push_back(k % 3 == 0 ? code(exclusion::slip) : k % 7 == 0 ? live_code : 1);
        }
    }
    static bool shown(int k) { return k % 3 != 0 && k % 11 != 0; }
};

std::vector<int> numbers(const recent_samples& of)
{
    std::vector<int> found;
    for (const auto& y : of.samples())
        found.push_back(static_cast<int>(y.real()));
    return found;
}

std::vector<int> latest_before(int end)
{
    std::vector<int> found;
    for (int k = end - 1; k >= 0 && found.size() < recent_samples::most; --k)
        if (numbered::shown(k))
            found.push_back(k);
    return {found.rbegin(), found.rend()};
}

} // namespace

TEST(RecentSamples, TheLatestThatAreJudgedOrLive)
{
    const numbered s(3000);
    for (const std::size_t piece : {1U, 7U, 255U, 256U, 1000U, 3000U}) {
        recent_samples kept;
        std::size_t at = 0;
        for (; at + piece <= 3000; at += piece)
            kept.add(&s.samples[at], &s.reference[at], piece);
        EXPECT_EQ(numbers(kept), latest_before(static_cast<int>(at))) << piece;
    }
}

TEST(RecentSamples, WindowsKeepTheLatestOfBoth)
{
    const numbered s(600);
    for (const std::size_t cut : {0U, 10U, 300U, 590U, 600U}) {
        recent_samples first, second;
        first.add(s.samples.data(), s.reference.data(), cut);
        second.add(s.samples.data() + cut, s.reference.data() + cut, 600 - cut);
        first.merge(second);
        EXPECT_EQ(numbers(first), latest_before(600)) << cut;
    }
}

TEST(RecentSamples, OfTheWindowAndOfNoOther)
{
    const auto set = named_set("psk:4");
    link::watch_options options;
    options.window = 100;
    link::watch measured(set, options);
    const numbered s(200);
    std::vector<reference_t> reference(200, 1);
    std::vector<std::vector<int>> windows;
    measured.add(s.samples.data(), reference.data(), nullptr, 200, [&](link::watch::window&& w) {
        windows.push_back(numbers(w.recent));
    });
    ASSERT_EQ(windows.size(), 2U);
    EXPECT_EQ(windows[0].front(), 1);
    EXPECT_EQ(windows[0].back(), 98); // 99 is no number
    EXPECT_EQ(windows[1].front(), 100);
    EXPECT_EQ(windows[1].size(), 100U - 9U); // 110 … 198
}
