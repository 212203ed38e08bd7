// SPDX-License-Identifier: GPL-3.0-or-later
// trial: frames and verdicts in the reports of whole runs: pass, fail, undecided, too much left out.
#include "halfplane/link/trial.h"

#include "halfplane/link/watch.h"
#include "halfplane/set_file.h"
#include "simulated.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <string>

using namespace halfplane;
using namespace halfplane::link;
using halfplane::testing::simulate;
using halfplane::testing::simulated;

namespace {

report
last_report(const signal_set& set, const simulated& s, const trial_options& trial, std::size_t piece = 4096)
{
    watch_options options;
    options.trial = trial;
    watch measured(set, options);
    report last;
    const auto keep = [&](watch::window&& w) { last = measured.report_of(std::move(w)); };
    for (std::size_t k = 0; k < s.samples.size(); k += piece)
        measured.add(&s.samples[k], &s.reference[k], nullptr, std::min(piece, s.samples.size() - k), keep);
    measured.close(keep);
    return last;
}

simulated at_ser(const signal_set& set, double ser, std::size_t n, std::uint64_t seed = 1)
{
    return simulate(set, n, to_db(*predictor(set).es_n0_for_ser(ser)), seed);
}

std::string target_of(const char* kind, double rate)
{
    return std::string(kind) + ":" + std::to_string(rate);
}

std::string refusal(const trial_options& trial)
{
    watch_options options;
    options.trial = trial;
    try {
        watch measured(named_set("psk:4"), options);
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(Trial, PassFailAndUndecidedOnSymbolsAndBits)
{
    const auto set = named_set("qam:16");
    const double ser = 0.01, ber = ser / 4; // Gray: nearly one bit a symbol error
    const auto s = at_ser(set, ser, 400000);
    struct row {
        std::string target;
        const char* state;
    };
    for (const auto& [target, state] : {row{target_of("ser", 3 * ser), "pass"},
                                        row{target_of("ser", ser / 3), "fail"},
                                        row{target_of("ser", ser), "undecided"},
                                        row{target_of("ber", 3 * ber), "pass"},
                                        row{target_of("ber", ber / 3), "fail"},
                                        row{target_of("ber", ber), "undecided"}}) {
        const auto v = last_report(set, s, {target})["verdict"];
        EXPECT_EQ(v["state"], state) << target << ' ' << v;
        EXPECT_EQ(v["block"], 64u) << target; // 256 bits of 4 a symbol
        EXPECT_EQ(v["excluded_share"], 0.0);
        if (v["state"] != "undecided") {
            EXPECT_GT(v[std::string("log_wealth_") + state], std::log(40)) << target;
            EXPECT_FALSE(v.contains("symbols_to_go"));
        }
    }
}

TEST(Trial, EqualsABetOnTheSameErrorsCountedOffline)
{
    const auto set = named_set("hex:19");
    auto s = at_ser(set, 0.02, 50001);
    halfplane::testing::spoil(s);
    verdict_options by_hand;
    by_hand.target = 0.01;
    by_hand.dependence = 52; // ⌈256/5⌉
    by_hand.errors_per_step = 5;
    verdict bets(by_hand);
    std::vector<std::uint16_t> decided(s.samples.size());
    kernels::point_decider(set).decide_reference(s.samples.data(), decided.data(), decided.size());
    std::uint64_t left_out = 0;
    for (std::size_t k = 0; k < decided.size(); ++k) {
        const auto sent = s.reference[k];
        if (sent < -1 || (sent >= 0 && decided[k] == kernels::point_decider::nonfinite))
            ++left_out;
        else if (sent >= 0)
            bets.add(1,
                     label_distance(set.labels()[static_cast<std::size_t>(sent)], set.labels()[decided[k]]));
    }
    for (const std::size_t piece : {std::size_t{4096}, std::size_t{7}, decided.size()}) {
        const auto v = last_report(set, s, {"ber:0.01"}, piece)["verdict"];
        EXPECT_EQ(v["log_wealth_pass"], *bets.look().log_wealth_pass);
        EXPECT_EQ(v["log_wealth_fail"], *bets.look().log_wealth_fail);
        EXPECT_EQ(v["excluded_share"],
                  static_cast<double>(left_out) / static_cast<double>(left_out + bets.steps()));
    }
}

TEST(Trial, TooMuchLeftOutForbidsPassing)
{
    const auto set = named_set("psk:4");
    auto s = simulate(set, 100000, 30, 1);
    const auto state = [&](double most = 1e-3) {
        return last_report(set, s, {"ser:1e-2", 0, most})["verdict"]["state"].get<std::string>();
    };
    EXPECT_EQ(state(), "pass");
    for (std::size_t k = 0; k < 5000; ++k)
        s.reference[k] = code(exclusion::before_lock);
    EXPECT_EQ(state(), "pass") << "what came before the lock is not held against it";
    for (std::size_t k = 50000; k < 50200; ++k)
        s.reference[k] = code(exclusion::slip);
    EXPECT_EQ(state(), "undecided");
    EXPECT_EQ(state(0.01), "pass");
}

TEST(Trial, FramesOfIndependentErrorsAndTheirVerdict)
{
    // A frame of 50 symbols is in error with 1 − (1 − p)^50.
    const auto set = named_set("psk:8");
    const double p = 0.002, fer = -std::expm1(50 * std::log1p(-p));
    const auto s = at_ser(set, p, 1000000);
    const auto made = last_report(set, s, {target_of("fer", fer / 2), 50});
    const auto& total = made["total"];
    EXPECT_EQ(total["frames"], 20000u);
    // Binomial, four standard deviations: 6e-5.
    EXPECT_NEAR(total["fer"], fer, 4 * std::sqrt(fer * (1 - fer) / 20000));
    EXPECT_LT(total["fer_low"], total["fer"]);
    EXPECT_GT(total["fer_high"], total["fer"]);
    EXPECT_EQ(made["verdict"]["state"], "fail");
    EXPECT_EQ(made["verdict"]["block"], 1u);
    EXPECT_EQ(last_report(set, s, {target_of("fer", 2 * fer), 50})["verdict"]["state"], "pass");
    EXPECT_EQ(last_report(set, s, {target_of("fer", fer), 50})["verdict"]["state"], "undecided");
}

TEST(Trial, WindowsOfFramesAddUpToTheRun)
{
    const auto set = named_set("psk:4");
    auto s = at_ser(set, 0.01, 30000);
    halfplane::testing::spoil(s);
    watch_options options;
    options.window = 777;
    options.trial.frame_symbols = 20;
    watch measured(set, options);
    std::uint64_t frames = 0, errors = 0, excluded = 0;
    report last;
    const auto keep = [&](watch::window&& w) {
        last = measured.report_of(std::move(w));
        frames += last["window"]["frames"].get<std::uint64_t>();
        errors += last["window"]["frame_errors"].get<std::uint64_t>();
        for (const auto& cause : last["window"]["frames_excluded"])
            excluded += cause.get<std::uint64_t>();
        EXPECT_EQ(last["total"]["frames"], frames);
        EXPECT_EQ(last["total"]["frame_errors"], errors);
    };
    measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), keep);
    measured.close(keep);
    // The first symbol is excluded, so the grid begins with the second.
    EXPECT_EQ(frames + excluded, (30000u - 1) / 20);
    EXPECT_GT(excluded, 0u);
    EXPECT_FALSE(last.contains("verdict"));
}

TEST(Trial, MergedWindowsKeepThem)
{
    const auto set = named_set("psk:4");
    const auto s = at_ser(set, 0.01, 5000);
    watch_options options;
    options.window = 1000;
    options.trial = {"ser:0.05", 10};
    watch measured(set, options);
    std::optional<watch::window> all;
    const auto keep = [&](watch::window&& w) {
        if (all)
            all->merge(std::move(w));
        else
            all.emplace(std::move(w));
    };
    measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), keep);
    const auto made = measured.report_of(std::move(*all));
    EXPECT_EQ(made["window"]["frames"], 500u);
    EXPECT_EQ(made["verdict"], last_report(set, s, {"ser:0.05", 10})["verdict"]);
}

TEST(Trial, SettingsNameTargetAndFrame)
{
    watch_options options;
    const auto set = named_set("psk:4");
    EXPECT_FALSE(watch(set, options).settings().contains("target"));
    options.trial = {"fer:1e-2", 100, 0.01};
    const auto settings = watch(set, options).settings();
    EXPECT_EQ(settings["target"], "fer:1e-2");
    EXPECT_EQ(settings["frame_symbols"], 100u);
    EXPECT_EQ(settings["max_excluded"], 0.01);
}

TEST(Trial, Refuses)
{
    EXPECT_EQ(refusal({"fer:1e-2"}), "target is 'fer:1e-2', but frame_symbols is 0");
    EXPECT_EQ(refusal({"ser:2"}), "target is 'ser:2'; a rate between 0 and 1 is wanted behind ser:");
    EXPECT_EQ(refusal({"", std::uint64_t{1} << 33}), "frame_symbols must be at most 2^32, got 8589934592");
    EXPECT_EQ(refusal({"ser:0.1", 0, std::nan("")}), "max_excluded must lie in 0 … 1, got nan");
}
