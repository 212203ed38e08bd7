// SPDX-License-Identifier: GPL-3.0-or-later
// live: links that know some symbols in advance, some by decoding, most not at all: three accounts that never
// mix.
#include "halfplane/link/watch.h"
#include "simulated.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

using namespace halfplane;
using namespace halfplane::link;
using namespace halfplane::testing;

namespace {

report last_report(watch& measured, const simulated& s, std::size_t piece = 777)
{
    report last;
    const auto keep = [&](watch::window&& w) { last = measured.report_of(std::move(w)); };
    for (std::size_t k = 0; k < s.samples.size(); k += piece)
        measured.add(&s.samples[k], &s.reference[k], nullptr, std::min(piece, s.samples.size() - k), keep);
    measured.close(keep);
    return last;
}

/// In frames of `frame` symbols the first `known` stay, the last `decoded` are flagged, the rest is live.
simulated with_frames(simulated s, std::size_t frame, std::size_t known, std::size_t decoded)
{
    for (std::size_t k = 0; k < s.reference.size(); ++k)
        if (k % frame >= frame - decoded)
            s.reference[k] |= decoded_flag;
        else if (k % frame >= known)
            s.reference[k] = live_code;
    return s;
}

/// The part of s whose references pass, with the flag taken off.
template <typename Pass>
simulated part(const simulated& s, Pass pass)
{
    simulated out;
    for (std::size_t k = 0; k < s.reference.size(); ++k)
        if (pass(s.reference[k])) {
            out.samples.push_back(s.samples[k]);
            out.reference.push_back(static_cast<reference_t>(s.reference[k] & ~decoded_flag));
        }
    return out;
}

bool known(reference_t r)
{
    return r >= 0 && (r & decoded_flag) == 0;
}
bool by_decoding(reference_t r)
{
    return r >= 0 && (r & decoded_flag) != 0;
}

std::uint64_t account(const report& total)
{
    auto sum = total["judged"].get<std::uint64_t>() + total["nonfinite"].get<std::uint64_t>() +
               total["pending"].get<std::uint64_t>() + total.value("live", std::uint64_t{0}) +
               total.value("decoded", std::uint64_t{0});
    for (const auto& cause : total["excluded"])
        sum += cause.get<std::uint64_t>();
    return sum;
}

} // namespace

/// Headline and decoded part equal what a watch says that is given these symbols alone.
TEST(Live, EachPartSpeaksOfItsOwnSymbols)
{
    for (const char* name : {"psk:2", "qam:16", "hex:19", "qam:4096"}) {
        const auto set = named_set(name);
        const double db = to_db(*predictor(set).es_n0_for_ser(0.1));
        const auto s = with_frames(simulate(set, 60000, db, 4), 600, 64, 150);
        watch_options options;
        options.window = 7000;
        options.explain = false;
        watch mixed(set, options), of_known(set, options), of_decoded(set, options);
        const auto total = last_report(mixed, s)["total"];
        const auto alone = last_report(of_known, part(s, known))["total"];
        const auto decoded = last_report(of_decoded, part(s, by_decoding))["total"];
        for (const char* field : {"symbols", "symbol_errors", "bits", "bit_errors", "by_bit"}) {
            EXPECT_EQ(total[field], alone[field]) << name << " " << field;
        }
        for (const char* field : {"symbols", "symbol_errors", "bits", "bit_errors"})
            EXPECT_EQ(total["decoded_part"][field], decoded[field]) << name << " " << field;
        EXPECT_EQ(total["symbols"], 6400u);
        EXPECT_EQ(total["decoded"], 15000u);
        EXPECT_EQ(total["live"], 60000u - 6400 - 15000);
        EXPECT_EQ(total["in"], 60000u);
        EXPECT_EQ(account(total), 60000u);
        for (const char* field : {"es_n0_db", "es_n0_db_se", "gain_db", "evm_rms"}) {
            EXPECT_NEAR(total[field].get<double>(), alone[field].get<double>(), 1e-9) << name << " " << field;
            EXPECT_NEAR(total["decoded_part"][field].get<double>(), decoded[field].get<double>(), 1e-9)
                << name;
        }
        const auto& live = total["live_part"];
        EXPECT_EQ(live["symbols"], total["live"]);
        EXPECT_EQ(live["gauged"], total["live"]);
        EXPECT_NEAR(live["es_n0_db"].get<double>(), db, 4.5 * live["es_n0_db_se"].get<double>()) << name;
        EXPECT_NEAR(live["predicted"]["exact"]["ser"].get<double>(), 0.1, 0.02) << name;
        EXPECT_GT(live["predicted"]["exact"]["ber"].get<double>(), 0);
        EXPECT_FALSE(live.contains("ser")); // nothing was counted
        EXPECT_FALSE(live.contains("symbol_errors"));
    }
}

/// Frames that failed are missing among the decoded ones: were these counted with the rest, half of the
/// errors would be gone.
TEST(Live, WhatOnlyDecodedFramesShowNeverReachesTheHeadline)
{
    const auto set = named_set("qam:16");
    auto s = simulate(set, 400000, 15, 11);
    std::vector<std::uint16_t> taken_for(s.samples.size());
    kernels::point_decider(set).decide_reference(s.samples.data(), taken_for.data(), taken_for.size());
    constexpr std::size_t frame = 100, preamble = 20;
    for (std::size_t first = 0; first < s.samples.size(); first += frame) {
        bool whole = true; // a checksum without correction: holds where no symbol errs
        for (std::size_t k = first; k < first + frame; ++k)
            whole &= taken_for[k] == s.reference[k];
        for (std::size_t k = first + preamble; k < first + frame; ++k)
            s.reference[k] = whole ? static_cast<reference_t>(s.reference[k] | decoded_flag) : live_code;
    }
    watch_options options;
    options.trial.target = "ser:0.01";
    watch measured(set, options);
    const auto report = last_report(measured, s);
    const auto& total = report["total"];
    const double truth = predictor(set).ser(from_db(15));
    EXPECT_GT(truth, 0.012);
    EXPECT_NEAR(total["ser"].get<double>(), truth, 4.5 * std::sqrt(truth / 80000));
    EXPECT_EQ(total["decoded_part"]["symbol_errors"], 0u);
    EXPECT_GT(total["decoded"].get<int>(), 40000);
    EXPECT_NE(report["verdict"]["state"], "pass"); // as it would with the decoded ones
    EXPECT_FALSE(report.contains(
        "premises")); // preambles alone are too short to explain, decoded frames no fair sample
    // Nor are they, or live symbols, ones that were left out.
    EXPECT_EQ(report["verdict"]["excluded_share"], 0.0);
}

/// Of frames that decoded well the residuals are smaller than noise has them: they explain nothing.
TEST(Live, DecodedSymbolsAreNotAskedWhyOthersErr)
{
    const auto set = named_set("qam:16");
    watch of_decoded(set, {}), of_known(set, {});
    const auto s = simulate(set, 100000, 16, 3);
    EXPECT_FALSE(last_report(of_decoded, with_frames(s, 600, 64, 536)).contains("explained_symbols"));
    EXPECT_GT(last_report(of_known, s)["explained_symbols"].get<int>(), 5000);
}

TEST(Live, TrafficAloneIsGaugedAndNothingElse)
{
    const auto set = named_set("apsk:4+12:2.85");
    const auto s = with_frames(simulate(set, 200000, 14, 2), 1000, 0, 0);
    watch_options options;
    options.trial = {"ber:0.1", 500};
    options.symbol_rate = 10000;
    watch measured(set, options);
    measured.set_input({16.0, 0.05, true});
    const auto report = last_report(measured, s);
    const auto& total = report["total"];
    EXPECT_EQ(total["symbols"], 0u);
    EXPECT_FALSE(total.contains("ser"));
    EXPECT_FALSE(total.contains("predicted"));
    EXPECT_FALSE(report.contains("shortfall"));
    EXPECT_EQ(report["verdict"]["state"], "undecided");
    EXPECT_EQ(total["frames"], 0u);
    EXPECT_EQ(report["seconds"]["unmeasured"], 20u);
    EXPECT_NEAR(total["live_part"]["es_n0_db"].get<double>(),
                14,
                4.5 * total["live_part"]["es_n0_db_se"].get<double>());
    EXPECT_LT(total["live_part"]["es_n0_db_se"].get<double>(), 0.025);
    EXPECT_EQ(total["live_part"]["sampled"], 200000u); // windows of 10,000 keep all
    EXPECT_EQ(report["window"]["live_part"]["symbols"], 10000u);
    EXPECT_EQ(account(total), 200000u);
}

/// An Es/N0 that wanders: rates are the sum over windows, not the rate of the mean.
TEST(Live, WanderIsSummedOverWindows)
{
    const auto set = named_set("qam:16");
    auto s = simulate(set, 100000, 12, 2);
    const auto good = simulate(set, 100000, 18, 3);
    s.samples.insert(s.samples.end(), good.samples.begin(), good.samples.end());
    s.reference.assign(200000, live_code);
    watch measured(set, {});
    const auto live = last_report(measured, s)["total"]["live_part"];
    const predictor p(set);
    const double mean = (p.ser(from_db(12)) + p.ser(from_db(18))) / 2;
    EXPECT_NEAR(live["predicted"]["exact"]["ser"].get<double>() / mean, 1, 0.03);
    EXPECT_NEAR(live["es_n0_db"].get<double>(), 15, 0.1);
    EXPECT_GT(mean / p.ser(from_db(15)), 3); // the rate of the mean would be far off
}

TEST(Live, MergedWindowsGaugeAStatedSample)
{
    const auto set = named_set("qam:16");
    const auto s = with_frames(simulate(set, 500000, 16, 7), 1000, 100, 0);
    watch measured(set, {});
    std::optional<watch::window> all;
    const auto merge = [&](watch::window&& w) {
        if (all)
            all->merge(std::move(w));
        else
            all.emplace(std::move(w));
    };
    measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), merge);
    measured.close(merge);
    const auto report = measured.report_of(std::move(*all));
    const auto& live = report["window"]["live_part"];
    EXPECT_EQ(live["symbols"], 450000u);
    EXPECT_GT(live["sampled"].get<std::size_t>(), thinned_samples::capacity / 3);
    EXPECT_LE(live["sampled"].get<std::size_t>(), thinned_samples::capacity);
    EXPECT_NEAR(live["es_n0_db"].get<double>(), 16, 4.5 * live["es_n0_db_se"].get<double>());
    EXPECT_EQ(report["total"]["live_part"]["gauged"], 450000u);
}

TEST(Live, ANonfiniteSampleIsCountedAndPoisonsNothing)
{
    const auto set = named_set("qam:16");
    auto s = with_frames(simulate(set, 50000, 16, 7), 500, 50, 50);
    for (std::size_t k = 0; k < s.samples.size(); k += 89)
        s.samples[k] = {std::numeric_limits<float>::quiet_NaN(), std::numeric_limits<float>::infinity()};
    watch measured(set, {});
    const auto total = last_report(measured, s)["total"];
    EXPECT_EQ(total["nonfinite"], 562u);
    EXPECT_EQ(account(total), 50000u);
    const auto& live = total["live_part"];
    EXPECT_NEAR(live["es_n0_db"].get<double>(), 16, 4.5 * live["es_n0_db_se"].get<double>());
}

TEST(Live, ACodeThatMeansNothingIsRefused)
{
    const auto set = named_set("hex:19");
    for (const int code : {19, 19 | decoded_flag, 0x2000, live_code - 1}) {
        auto s = simulate(set, 10, 16, 7);
        s.reference[4] = static_cast<reference_t>(code);
        watch measured(set, {});
        try {
            measured.add(s.samples.data(), s.reference.data(), nullptr, 10, [](watch::window&&) {});
            ADD_FAILURE() << code;
        } catch (const std::invalid_argument& error) {
            EXPECT_NE(std::string(error.what()).find("reference 4 is " + std::to_string(code)),
                      std::string::npos)
                << error.what();
        }
    }
}
