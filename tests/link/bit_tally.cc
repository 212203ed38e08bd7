// SPDX-License-Identifier: GPL-3.0-or-later
// bit_tally: known errors counted to the bit, bursts that widen intervals, the account, verdicts, refusals.
#include "halfplane/link/bit_tally.h"

#include <gtest/gtest.h>

#include <cmath>
#include <random>
#include <vector>

using namespace halfplane::link;

namespace {

using bytes = std::vector<std::uint8_t>;

bytes random_bits(std::size_t n, unsigned seed)
{
    std::mt19937_64 random(seed);
    bytes out(n);
    for (auto& b : out)
        b = random() & 1;
    return out;
}

bytes packed(const bytes& bits)
{
    bytes out(bits.size() / 8);
    for (std::size_t k = 0; k < out.size() * 8; ++k)
        out[k / 8] = static_cast<std::uint8_t>(out[k / 8] << 1 | bits[k]);
    return out;
}

report counted(const bytes& sent, const bytes& received, bit_tally_options o = {}, std::size_t piece = 1000)
{
    o.clock = [] { return std::string("2026-01-02T03:04:05Z"); };
    bit_tally tally(o);
    for (std::size_t k = 0; k < sent.size(); k += piece)
        tally.add(&sent[k], &received[k], std::min(piece, sent.size() - k));
    return tally.make_report(true);
}

bit_tally_options with(const char* target, std::uint64_t frame_bits = 0)
{
    bit_tally_options o;
    o.target = target;
    o.frame_bits = frame_bits;
    return o;
}

std::string refusal(bit_tally_options o)
{
    try {
        bit_tally tally(std::move(o));
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(BitTally, KnownErrorsToTheBitPackedOrNot)
{
    const auto sent = random_bits(80000, 1);
    auto received = sent;
    for (std::size_t k : {0u, 7u, 8u, 4095u, 4096u, 4097u, 79999u})
        received[k] ^= 1;
    auto o = with("", 1000);
    auto one = counted(sent, received, o);
    o.packed = true;
    auto eight = counted(packed(sent), packed(received), o, 37);
    for (const report* r : {&one, &eight}) {
        const auto& total = (*r)["total"];
        EXPECT_EQ(total["bits"], 80000u);
        EXPECT_EQ(total["bit_errors"], 7u);
        EXPECT_EQ(total["frames"], 80u);
        EXPECT_EQ(total["frame_errors"], 3u); // frames 0, 4 and 79
        EXPECT_EQ(total["in"], 80000u);
        EXPECT_NEAR(total["ber"], 7.0 / 80000, 1e-18);
        // Clopper and Pearson, scipy.stats.beta.ppf([.025], 7, 79994) and beta.ppf([.975], 8, 79993):
        // between 3.5e-5 and 1.81e-4
        EXPECT_GT(total["ber_low"], 3.4e-5);
        EXPECT_LT(total["ber_low"], 3.6e-5);
        EXPECT_GT(total["ber_high"], 1.79e-4);
        EXPECT_LT(total["ber_high"], 1.82e-4);
        EXPECT_FALSE(r->contains("verdict"));
    }
    EXPECT_NE(one["settings_sha256"], eight["settings_sha256"]);
    EXPECT_EQ(one["total"], eight["total"]);
}

TEST(BitTally, PiecesMakeNoDifference)
{
    const auto sent = random_bits(30000, 2);
    auto received = sent;
    std::mt19937_64 random(3);
    for (int k = 0; k < 500; ++k)
        received[random() % received.size()] ^= 1;
    const auto o = with("ber:0.01", 77);
    const auto whole = counted(sent, received, o, sent.size());
    EXPECT_GT(whole["total"]["frame_errors"], 100u);
    for (const std::size_t piece : {1u, 7u, 1023u})
        EXPECT_EQ(whole, counted(sent, received, o, piece));
}

TEST(BitTally, BurstsWidenTheInterval)
{
    const auto sent = random_bits(1000000, 4);
    auto received = sent;
    for (std::size_t k = 5000; k + 50 < received.size(); k += 20000) // 50 bursts of 50
        for (std::size_t i = 0; i < 50; ++i)
            received[k + i] ^= 1;
    auto alone = sent;
    for (std::size_t k = 200; k < 1000000 && k / 400 < 2500; k += 400) // as many errors one by one
        alone[k] ^= 1;
    const auto burst = counted(sent, received)["total"], single = counted(sent, alone)["total"];
    EXPECT_EQ(burst["bit_errors"], 2500u);
    EXPECT_EQ(single["bit_errors"], 2500u);
    EXPECT_EQ(single["dispersion"], 1.0);
    EXPECT_GT(burst["dispersion"], 20.0);
    const auto width = [](const report& t) {
        return t["ber_high"].get<double>() - t["ber_low"].get<double>();
    };
    EXPECT_GT(width(burst), 4 * width(single)); // √dispersion
}

TEST(BitTally, WhatIsNoBitIsLeftOutAndAccountedFor)
{
    const auto sent = random_bits(10000, 5);
    auto received = sent;
    for (std::size_t k = 0; k < received.size(); k += 100)
        received[k] = 2;
    auto also = sent;
    also[150] = received[150] = 7; // equal, and still no bit
    auto o = with("ber:0.1", 50);
    bit_tally tally(o);
    tally.skip(13);
    tally.add(also.data(), received.data(), also.size());
    const auto made = tally.make_report();
    const auto& total = made["total"];
    EXPECT_EQ(total["judged"], 10000u - 101);
    EXPECT_EQ(total["excluded"], (report{{"delay", 13u}, {"no_bit", 101u}}));
    EXPECT_EQ(total["in"], 10013u);
    EXPECT_EQ(total["bit_errors"], 0u);
    EXPECT_FALSE(total.contains("ber_low"));
    // The grid begins with bit 1; a frame of 50 holds 100, 200 … or not: 99 of them and that of bit 150.
    EXPECT_EQ(total["frames"].get<int>() + total["frames_excluded"]["no_bit"].get<int>(), 9999 / 50);
    EXPECT_EQ(made["verdict"]["state"], "undecided");
    EXPECT_NEAR(made["verdict"]["excluded_share"], 101.0 / 10000, 1e-15);
    o.max_excluded = 0.02;
    bit_tally lenient(o);
    lenient.add(also.data(), received.data(), also.size());
    EXPECT_EQ(lenient.make_report()["verdict"]["state"],
              "undecided"); // 38 blocks of 256: one short of the wealth
}

TEST(BitTally, Verdicts)
{
    std::mt19937_64 random(6);
    const auto sent = random_bits(2000000, 6);
    auto received = sent;
    for (auto& b : received)
        b ^= random() % 1000 == 0;
    const auto state = [&](const char* target, std::uint64_t frame = 0) {
        return counted(sent, received, with(target, frame))["verdict"]["state"].get<std::string>();
    };
    EXPECT_EQ(state("ber:3e-3"), "pass");
    EXPECT_EQ(state("ber:3e-4"), "fail");
    EXPECT_EQ(state("ber:1e-3"), "undecided");
    EXPECT_EQ(state("fer:0.2", 100), "pass"); // 1 − 0.999^100 = 0.095
    EXPECT_EQ(state("fer:0.05", 100), "fail");
}

TEST(BitTally, WindowsAddUp)
{
    const auto sent = random_bits(5000, 7);
    auto received = sent;
    received[10] ^= 1;
    received[4000] ^= 1;
    bit_tally tally(with("", 500));
    tally.add(sent.data(), received.data(), 2250);
    const auto first = tally.make_report();
    tally.add(&sent[2250], &received[2250], 2750);
    const auto second = tally.make_report(true);
    EXPECT_EQ(first["window"]["frames"], 4u);
    EXPECT_EQ(second["window"]["first_bit"], 2250u);
    EXPECT_EQ(second["window"]["bit_errors"], 1u);
    EXPECT_EQ(second["window"]["frames"], 6u);
    EXPECT_EQ(second["total"]["bit_errors"], 2u);
    EXPECT_EQ(second["total"]["frame_errors"], 2u);
    EXPECT_EQ(second["sequence"], 1u);
    EXPECT_EQ(bit_tally({}).make_report()["total"]["bits"], 0u); // nothing came: no rate, no division
}

TEST(BitTally, Refuses)
{
    EXPECT_EQ(refusal(with("ser:1e-3")), "target is 'ser:1e-3': there are bits and frames here, no symbols");
    EXPECT_EQ(refusal(with("fer:1e-3")), "target is 'fer:1e-3', but frame_bits is 0");
    EXPECT_EQ(refusal(with("ber:0")), "target is 'ber:0'; a rate between 0 and 1 is wanted behind ber:");
    auto o = with("");
    o.confidence = 1;
    EXPECT_EQ(refusal(o), "confidence must lie between 0 and 1, got 1");
    o = with("");
    o.max_excluded = std::nan("");
    EXPECT_EQ(refusal(o), "max_excluded must lie in 0 … 1, got nan");
}
