// SPDX-License-Identifier: GPL-3.0-or-later
// frame_counts: the grid against a plain list, in any pieces; error_target: read and refused.
#include "halfplane/frame_counts.h"
#include "halfplane/error_target.h"

#include <gtest/gtest.h>

#include <random>
#include <stdexcept>
#include <string>
#include <vector>

using namespace halfplane;

namespace {

enum step { good = 0, bad = 1, left_out_0 = 2 }; // left_out_0 + cause

struct by_list {
    std::uint64_t frames = 0, errors = 0;
    std::array<std::uint64_t, frame_counts::causes> excluded{};
    std::vector<bool> judged;
};

by_list count(const std::vector<int>& steps, std::size_t length)
{
    by_list out;
    std::size_t first = 0;
    while (first < steps.size() && steps[first] >= left_out_0)
        ++first;
    for (std::size_t k = first; k + length <= steps.size(); k += length) {
        bool wrong = false;
        int cause = -1;
        for (std::size_t i = k; i < k + length; ++i) {
            wrong |= steps[i] == bad;
            if (steps[i] >= left_out_0 && cause < 0)
                cause = steps[i] - left_out_0;
        }
        if (cause >= 0) {
            ++out.excluded[static_cast<std::size_t>(cause)];
        } else {
            ++out.frames;
            out.errors += wrong;
            out.judged.push_back(wrong);
        }
    }
    return out;
}

std::string refusal(const std::string& text)
{
    try {
        parse_error_target(text);
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(FrameCounts, EqualAPlainListInAnyPieces)
{
    std::mt19937_64 random(1);
    for (const std::size_t length : {1u, 2u, 7u, 100u, 1000u})
        for (int run = 0; run < 20; ++run) {
            std::vector<int> steps;
            frame_counts counted(length);
            std::vector<bool> judged;
            const auto take = [&](std::uint64_t n, bool wrong) { judged.insert(judged.end(), n, wrong); };
            for (int piece = 0; piece < 60; ++piece) {
                const auto n = random() % (3 * length + 1);
                switch (random() % 3) {
                case 0:
                    counted.add_clear(n, take);
                    steps.insert(steps.end(), n, good);
                    break;
                case 1:
                    counted.add_error(take);
                    steps.push_back(bad);
                    break;
                default: {
                    const auto cause = random() % frame_counts::causes;
                    counted.leave_out(n, cause, take);
                    steps.insert(steps.end(), n, left_out_0 + static_cast<int>(cause));
                }
                }
                const auto truth = count(steps, length);
                ASSERT_EQ(counted.frames, truth.frames);
                ASSERT_EQ(counted.frame_errors, truth.errors);
                ASSERT_EQ(counted.excluded, truth.excluded);
                ASSERT_EQ(judged, truth.judged);
            }
        }
}

TEST(FrameCounts, NoLengthNoFrames)
{
    frame_counts none;
    const auto never = [](std::uint64_t, bool) { FAIL(); };
    none.add_clear(1000, never);
    none.add_error(never);
    none.leave_out(3, 0, never);
    EXPECT_EQ(none.frames + none.all_excluded(), 0u);
}

TEST(FrameCounts, ARestartBeginsAFrame)
{
    frame_counts f(4);
    const auto any = [](std::uint64_t, bool) {};
    f.add_clear(3, any);
    f.add_error(any);
    f.add_error(any);
    f.restart();
    f.leave_out(9, 1, any); // before the first judged step of the new stream
    f.add_clear(4, any);
    EXPECT_EQ(f.frames, 2u);
    EXPECT_EQ(f.frame_errors, 1u);
    EXPECT_EQ(f.all_excluded(), 0u);
}

TEST(ErrorTarget, ReadAndRefused)
{
    EXPECT_EQ(parse_error_target("ser:1e-3").rate, 1e-3);
    EXPECT_EQ(parse_error_target("ber:1e-5").kind, error_kind::ber);
    EXPECT_STREQ(to_string(parse_error_target("fer:0.01").kind), "fer");
    for (const std::string text : {"ser", "ser:", "ser:0", "ser:1", "ber:-1", "fer:nan", "ber:1e-3x"})
        EXPECT_EQ(refusal(text),
                  "target is '" + text + "'; a rate between 0 and 1 is wanted behind " + text.substr(0, 3) +
                      ":");
    for (const std::string text : {"", "per:1e-3", "1e-3", ":1e-3", "SER:1e-3"})
        EXPECT_EQ(refusal(text), "target is '" + text + "'; ser:RATE, ber:RATE or fer:RATE is wanted");
}
