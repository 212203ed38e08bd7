// SPDX-License-Identifier: GPL-3.0-or-later
// watch: the account under every fault, windows, input changes, MAP, decisions of the receiver, large sets,
// refusals.
#include "halfplane/link/watch.h"
#include "simulated.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>

using namespace halfplane;
using namespace halfplane::link;
using namespace halfplane::testing;

namespace {

std::vector<report> reports_of(watch& measured, const simulated& s, std::size_t piece = 777)
{
    std::vector<report> all;
    const auto keep = [&](watch::window&& w) { all.push_back(measured.report_of(std::move(w))); };
    for (std::size_t k = 0; k < s.samples.size(); k += piece)
        measured.add(&s.samples[k], &s.reference[k], nullptr, std::min(piece, s.samples.size() - k), keep);
    measured.close(keep);
    return all;
}

std::string refusal(const std::function<void()>& act)
{
    try {
        act();
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

void expect_account(const report& total)
{
    std::uint64_t sum = total["judged"].get<std::uint64_t>() + total["nonfinite"].get<std::uint64_t>() +
                        total["pending"].get<std::uint64_t>();
    for (const auto& cause : total["excluded"])
        sum += cause.get<std::uint64_t>();
    EXPECT_EQ(total["in"], sum);
    EXPECT_EQ(total["judged"], total["symbols"]);
    std::uint64_t errors = total.value("transitions_unlisted", std::uint64_t{0}), bits = 0;
    for (const auto& t : total["transitions"])
        errors += t[2].get<std::uint64_t>();
    for (const auto& b : total["by_bit"])
        bits += b.get<std::uint64_t>();
    EXPECT_EQ(total["symbol_errors"], errors);
    EXPECT_EQ(total["bit_errors"], bits);
}

void expect_no_odd_numbers(const report& r)
{
    if (r.is_structured())
        for (const auto& x : r)
            expect_no_odd_numbers(x);
    EXPECT_FALSE(r.is_null());
    if (r.is_number_float()) {
        EXPECT_TRUE(std::isfinite(r.get<double>()));
    }
}

} // namespace

TEST(Watch, EqualsTheOfflineCountForEverySizeOfSet)
{
    for (const char* name : {"psk:2", "psk:4", "qam:16", "cross:32", "qam:256", "qam:4096"}) {
        const auto set = named_set(name);
        const predictor p(set);
        auto s = simulate(set, 30001, to_db(*p.es_n0_for_ser(0.1)), 5);
        spoil(s);
        watch_options options;
        options.window = 9999;
        watch measured(set, options);
        measured.set_pending(77);
        const auto all = reports_of(measured, s);
        ASSERT_EQ(all.size(), 4u); // 9,999 three times and four more
        const auto& total = all.back()["total"];
        const auto truth = count_offline(set, s, s.samples.size());
        EXPECT_EQ(total["symbols"], truth.symbols) << name;
        EXPECT_EQ(total["symbol_errors"], truth.symbol_errors) << name;
        EXPECT_EQ(total["bit_errors"], truth.bit_errors) << name;
        EXPECT_EQ(total["nonfinite"], truth.nonfinite) << name;
        EXPECT_EQ(total["excluded"]["before_lock"], truth.excluded[0]) << name;
        EXPECT_EQ(total["excluded"]["overflow"], truth.excluded[3]) << name;
        EXPECT_EQ(total["in"], 30001u + 77) << name;
        std::uint64_t in_windows = 0;
        for (const auto& r : all) {
            expect_account(r["total"]);
            expect_no_odd_numbers(r);
            in_windows += r["window"]["symbols"].get<std::uint64_t>();
        }
        EXPECT_EQ(total["symbols"], in_windows);
        EXPECT_NEAR(total["predicted"]["exact"]["ser"].get<double>(), 0.1, 0.01) << name;
        EXPECT_EQ(total["transitions"][0].size(), set.size() <= 256 ? 4u : 3u) << name;
    }
}

TEST(Watch, ExpectedTransitionsAddUpToPredictedErrors)
{
    const auto set = named_set("cross:32");
    const predictor p(set);
    watch measured(set, {});
    const auto last = reports_of(measured, simulate(set, 50000, to_db(*p.es_n0_for_ser(0.5)), 6)).back();
    double expected = 0;
    for (const auto& t : last["total"]["transitions"])
        expected += t[3].get<double>();
    // At an SER of one half nearly every pair was counted, so the sum over counted ones is nearly Σ
    // n·SER(sent).
    EXPECT_NEAR(expected / 50000, last["total"]["predicted"]["exact"]["ser"].get<double>(), 0.01);
}

TEST(Watch, ADeclaredChangeOfTheInputClosesTheWindow)
{
    const auto set = named_set("psk:4");
    const auto s = simulate(set, 1000, 10, 7);
    watch measured(set, {});
    std::vector<report> all;
    const auto keep = [&](watch::window&& w) { all.push_back(measured.report_of(std::move(w))); };
    const auto add = [&](std::size_t first, std::size_t n) {
        measured.add(&s.samples[first], &s.reference[first], nullptr, n, keep);
    };
    add(0, 100);
    measured.set_input({12}); // first known: the hundred symbols before are not judged against it
    add(100, 200);
    measured.set_input({12}); // the same again
    add(300, 100);
    measured.set_input({9.5});
    EXPECT_EQ(all.size(), 1u);
    add(400, 100);
    measured.set_input({9.6, 0.1, true}); // measured values wander and close nothing
    add(500, 100);
    measured.close(keep);
    ASSERT_EQ(all.size(), 3u);
    EXPECT_FALSE(all[0].contains("input"));
    EXPECT_FALSE(all[0].contains("shortfall") && all[0]["shortfall"].contains("input"));
    EXPECT_EQ(all[1]["window"]["symbols"], 300u);
    EXPECT_EQ(all[1]["input"]["es_n0_db"], 12.0);
    EXPECT_EQ(all[2]["window"]["first_symbol"], 400u);
    EXPECT_EQ(all[2]["window"]["symbols"], 200u);
    EXPECT_EQ(all[2]["input"]["es_n0_db"], 9.6);
    EXPECT_EQ(all[2]["input"]["source"], "measured");
}

TEST(Watch, InputShortfallIsTheDifferenceWhereTheReceiverAddsNoise)
{
    // Declared 3 dB better than what reaches the decision: that is the implementation loss, and the decision
    // is on its curve.
    const auto set = named_set("qam:16");
    watch measured(set, {});
    measured.set_input({17});
    const auto last = reports_of(measured, simulate(set, 400000, 14, 8)).back();
    const auto& s = last["shortfall"];
    EXPECT_NEAR(s["input"]["db"].get<double>(), 3, 0.05) << s; // SER 0.08: 0.6 % of 32,000 errors is 0.01 dB
    EXPECT_LE(s["input"]["db_low"], 3.0);
    EXPECT_GE(s["input"]["db_high"], 3.0);
    EXPECT_LE(s["decision"]["db_low"], 0.0);
    EXPECT_GE(s["decision"]["db_high"], 0.0);
}

TEST(Watch, UnequalPriorsAreDecidedByMap)
{
    // Two points, priors 0.9 and 0.1 at 0 dB: MAP and nearest point differ widely, and the counts must follow
    // the exact rung of MAP.
    const auto set = signal_set({{1, 0}, {-1, 0}}, {0, 1}, 1, {0.9, 0.1}, "skewed");
    const auto s = simulate(set, 200000, 0, 9);
    for (const auto rule : {detector::automatic, detector::ml}) {
        watch_options options;
        options.rule = rule;
        watch measured(set, options);
        measured.set_input({0});
        const auto last = reports_of(measured, s).back();
        const double exact = predictor(set, std::make_shared<awgn>(), rule).ser(1);
        std::cout << last["detector"] << ": counted " << last["total"]["ser"] << ", exact at 0 dB " << exact
                  << '\n';
        EXPECT_EQ(last["detector"], rule == detector::ml ? "ml" : "map");
        EXPECT_NEAR(last["total"]["ser"].get<double>() / exact,
                    1,
                    0.03); // 5 standard errors of 15,000 errors, and 2 % of N0
    }
}

TEST(Watch, DecisionsOfTheReceiverAreTakenAsTheyAre)
{
    const auto set = named_set("psk:4");
    auto s = simulate(set, 1000, 30, 10);
    std::vector<std::uint16_t> decided(s.reference.begin(), s.reference.end());
    for (std::size_t k = 0; k < 1000; k += 10)
        decided[k] = static_cast<std::uint16_t>((decided[k] + 1) % 4);
    s.samples[5] = {0, std::numeric_limits<float>::infinity()};
    watch_options options;
    options.receiver_decisions = true;
    watch measured(set, options);
    report last;
    const auto keep = [&](watch::window&& w) { last = measured.report_of(std::move(w)); };
    measured.add(s.samples.data(), s.reference.data(), decided.data(), 1000, keep);
    measured.close(keep);
    EXPECT_EQ(last["decisions"], "receiver");
    EXPECT_EQ(last["total"]["symbol_errors"], 100u);
    EXPECT_EQ(last["total"]["symbols"], 999u);
    EXPECT_EQ(last["total"]["nonfinite"], 1u);
}

TEST(Watch, SecondsByTheSymbolRate)
{
    // 100.5 symbols a second: second k ends after ⌊(k + 1)·100.5⌋ symbols. By hand, 20 seconds: 0 and 1 hold
    // symbols from before the lock; one wrong symbol in 3 (2 bits of about 200: BER 1e-2, severe); a NaN in 5
    // (errored only); a slip in 7; the rest of the stream lost from 9 on, eleven seconds: unavailable.
    // Available: seconds 2 … 8, seven of them.
    const auto set = named_set("psk:4");
    auto s = simulate(set, 2015, 60, 13);
    const auto in_second = [](int k) { return static_cast<std::size_t>(std::floor(100.5 * k)) + 50; };
    for (std::size_t k = 0; k < 150; ++k)
        s.reference[k] = code(exclusion::before_lock);
    s.samples[in_second(3)] *= -1.0f;
    s.samples[in_second(5)] = {NAN, 0};
    s.reference[in_second(7)] = code(exclusion::slip);
    for (std::size_t k = 904; k < s.samples.size(); ++k) // ⌊9·100.5⌋ = 904
        s.reference[k] = code(exclusion::signal_lost);
    watch_options options;
    options.symbol_rate = 100.5;
    options.window = 333;
    for (std::size_t piece : {1u, 64u, 5000u}) {
        watch measured(set, options);
        const auto last = reports_of(measured, s, piece).back();
        const auto& seconds = last["seconds"];
        EXPECT_EQ(last["total"]["seconds"], 2015 / 100.5);
        EXPECT_EQ(seconds["unmeasured"], 2u);
        EXPECT_EQ(seconds["available"], 7u);
        EXPECT_EQ(seconds["unavailable"], 11u);
        EXPECT_EQ(seconds["errored"], 3u);
        EXPECT_EQ(seconds["severely_errored"], 2u);
        EXPECT_EQ(seconds["errored_ratio"], 3.0 / 7);
    }
}

TEST(Watch, NothingWasJudged)
{
    const auto set = named_set("psk:4");
    simulated s;
    s.samples.assign(500, {1, 1});
    s.reference.assign(500, code(exclusion::before_lock));
    watch measured(set, {});
    measured.set_lock({});
    const auto last = reports_of(measured, s).back();
    EXPECT_EQ(last["total"]["in"], 500u);
    EXPECT_EQ(last["total"]["judged"], 0u);
    for (const char* absent : {"ser", "ser_high", "ber", "es_n0_db", "predicted", "dispersion"})
        EXPECT_FALSE(last["total"].contains(absent)) << absent;
    EXPECT_FALSE(last.contains("shortfall"));
    EXPECT_EQ(last["lock"], report({{"state", "searching"}}));
    expect_account(last["total"]);
}

TEST(Watch, FieldsOfLaterWorkAreAbsent)
{
    const auto set = named_set("psk:4");
    watch measured(set, {});
    const auto last = reports_of(measured, simulate(set, 500, 10, 3)).back();
    for (const char* absent : {"pattern", "input", "lock", "seconds", "verdict", "losses", "premises"})
        EXPECT_FALSE(last.contains(absent)) << absent;
    for (const char* absent : {"seconds", "slips"})
        EXPECT_FALSE(last["total"].contains(absent)) << absent;
}

TEST(Watch, DigestTellsSettingsApart)
{
    const auto set = named_set("psk:4");
    auto digest = [](const signal_set& of, watch_options options) {
        watch measured(of, std::move(options));
        report made;
        measured.close([&](watch::window&& w) { made = measured.report_of(std::move(w)); }, true);
        return made["settings_sha256"].get<std::string>();
    };
    watch_options other_window, other_confidence, other_pattern, other_decisions;
    other_window.window = 5;
    other_confidence.confidence = 0.9;
    other_pattern.pattern = "o150:9";
    other_decisions.receiver_decisions = true;
    std::vector<std::string> all = {digest(set, {}),
                                    digest(set, other_window),
                                    digest(set, other_confidence),
                                    digest(set, other_pattern),
                                    digest(set, other_decisions),
                                    digest(set.scaled(2), {}),
                                    digest(set.renamed("x"), {}),
                                    digest(set.relabelled({3, 1, 2, 0}), {})};
    EXPECT_EQ(digest(set, {}), all[0]);
    std::sort(all.begin(), all.end());
    EXPECT_EQ(std::unique(all.begin(), all.end()), all.end());
}

TEST(Watch, RefusesWhatItCannotUse)
{
    const auto set = named_set("psk:4");
    const auto with = [&](auto change) {
        watch_options options;
        change(options);
        return refusal([&] { watch(set, options); });
    };
    EXPECT_EQ(with([](auto& o) { o.window = 0; }), "window must be at least 1 symbol, got 0");
    EXPECT_EQ(with([](auto& o) { o.confidence = 1; }), "confidence must lie between 0 and 1, got 1");
    EXPECT_EQ(with([](auto& o) { o.symbol_rate = -1; }),
              "symbol_rate must be a number of Hz, or 0 where unknown, got -1");
    EXPECT_EQ(with([](auto& o) { o.symbol_rate = NAN; }),
              "symbol_rate must be a number of Hz, or 0 where unknown, got nan");

    watch measured(set, {});
    EXPECT_EQ(refusal([&] { measured.set_input({INFINITY}); }),
              "es_n0_db at the input must be finite, got inf");
    EXPECT_EQ(refusal([&] {
                  measured.set_input({10, -1});
              }),
              "es_n0_db_se at the input must be finite and at least 0, got -1");

    auto s = simulate(set, 3000, 20, 11);
    const auto ignore = [](watch::window&&) {};
    s.reference[2500] = 4;
    EXPECT_EQ(refusal([&] { measured.add(s.samples.data(), s.reference.data(), nullptr, 3000, ignore); }),
              "reference 2500 is 4: neither an index of 4 points nor an exclusion, nor live traffic");
    EXPECT_EQ(measured.handed_in(), 2048u) << "what came before stands";
    s.reference[0] = -6;
    EXPECT_EQ(refusal([&] { measured.add(s.samples.data(), s.reference.data(), nullptr, 1, ignore); }),
              "reference 2048 is -6: neither an index of 4 points nor an exclusion, nor live traffic");
    const std::uint16_t decided = 4;
    EXPECT_EQ(refusal([&] { measured.add(&s.samples[1], &s.reference[1], &decided, 1, ignore); }),
              "decisions were handed in, but `receiver_decisions` is off");
    watch_options receiver;
    receiver.receiver_decisions = true;
    watch other(set, receiver);
    EXPECT_EQ(refusal([&] { other.add(&s.samples[1], &s.reference[1], nullptr, 1, ignore); }),
              "decisions of the receiver were promised and are missing");
    EXPECT_EQ(refusal([&] { other.add(&s.samples[1], &s.reference[1], &decided, 1, ignore); }),
              "decision 0 is 4: the set has 4 points");
}
