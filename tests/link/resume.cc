// SPDX-License-Identifier: GPL-3.0-or-later
// resume: a run that is killed goes on from its log as if nothing had been; other settings are refused by
// name.
#include "halfplane/link/log.h"
#include "halfplane/link/reporter.h"
#include "halfplane/set_file.h"
#include "simulated.h"

#include <gtest/gtest.h>

#include <sys/wait.h>
#include <unistd.h>

#include <cmath>
#include <csignal>
#include <filesystem>
#include <fstream>

using namespace halfplane;
using namespace halfplane::link;
using halfplane::testing::simulate;
using halfplane::testing::simulated;
namespace fs = std::filesystem;

namespace {

constexpr std::size_t window = 2000;

class Resume : public ::testing::Test
{
protected:
    void SetUp() override
    {
        d_folder = fs::temp_directory_path() / ("halfplane-resume-" + std::to_string(::getpid()));
        fs::create_directories(d_folder);
    }
    void TearDown() override { fs::remove_all(d_folder); }
    std::string path(const char* name) const { return (d_folder / name).string(); }

    fs::path d_folder;
};

watch_options options_of(const std::string& resume = {})
{
    watch_options o;
    o.window = window;
    o.symbol_rate = 1000; // a window is two whole seconds
    o.trial = {"ber:0.01", 20};
    o.resume = resume;
    o.clock = [] { return std::string("2026-01-02T03:04:05Z"); };
    return o;
}

/// Symbols [from, to) counted into the log at `log`, and the last report.
report run(const signal_set& set,
           const simulated& s,
           watch_options o,
           std::size_t from,
           std::size_t to,
           const std::string& log = {})
{
    watch measured(set, std::move(o));
    measured.set_input({12, 0.1, true});
    measured.set_lock({lock_state::held, 3, 0, false, false, 0, 0});
    std::optional<report_log> out;
    if (!log.empty())
        out.emplace(log);
    report last;
    const auto keep = [&](watch::window&& w) {
        last = measured.report_of(std::move(w));
        if (!out)
            return;
        EXPECT_TRUE(out->keep(measured.carry().dump())) << out->last_error();
        EXPECT_TRUE(out->write(last)) << out->last_error();
    };
    for (std::size_t k = from; k < to; k += 700)
        measured.add(&s.samples[k], &s.reference[k], nullptr, std::min<std::size_t>(700, to - k), keep);
    measured.close(keep);
    return last;
}

std::string refusal(const signal_set& set, const watch_options& o)
{
    try {
        watch measured(set, o);
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

/// Losses and premises look at stretches drawn by chance, anew after a resumption: their rows are of the same
/// kinds.
void drop_what_is_drawn(report& r)
{
    r.erase("losses");
    r.erase("premises");
}

void expect_same(const report& a, const report& b, const std::string& where = "report")
{
    ASSERT_EQ(a.type() == report::value_t::null, b.type() == report::value_t::null) << where;
    if (a.is_object()) {
        ASSERT_EQ(a.size(), b.size()) << where;
        for (const auto& [key, value] : a.items()) {
            ASSERT_TRUE(b.contains(key)) << where << '.' << key;
            expect_same(value, b[key], where + '.' + key);
        }
    } else if (a.is_array()) {
        ASSERT_EQ(a.size(), b.size()) << where;
        for (std::size_t k = 0; k < a.size(); ++k)
            expect_same(a[k], b[k], where + '[' + std::to_string(k) + ']');
    } else if (a.is_number_float()) {
        // A shortfall is the difference of two roots near 30 dB, each good to their last digits.
        const double root = where.find("shortfall") != std::string::npos ? 1e-11 : 0;
        EXPECT_NEAR(a.get<double>(), b.get<double>(), root + 1e-12 * std::abs(a.get<double>())) << where;
    } else {
        EXPECT_EQ(a, b) << where;
    }
}

} // namespace

TEST_F(Resume, TotalsEqualThoseOfARunThatWasNotInterrupted)
{
    for (const char* name : {"qam:16", "hex:19", "qam:4096"}) {
        const auto set = named_set(name);
        auto s = simulate(set, 20 * window, to_db(*predictor(set).es_n0_for_ser(0.05)), 3);
        halfplane::testing::spoil(s);
        auto whole = run(set, s, options_of(), 0, s.samples.size());
        const auto log = path(("of-" + std::to_string(set.size()) + ".jsonl").c_str());
        // Three runs of 7, 1 and 12 windows; the first finds no log and begins. Frames of 20 end with a
        // window where the first judged symbol begins the grid at 1; so one frame each is cut short.
        run(set, s, options_of(log), 0, 7 * window, log);
        run(set, s, options_of(log), 7 * window, 8 * window, log);
        auto resumed = run(set, s, options_of(log), 8 * window, s.samples.size(), log);
        for (auto* r : {&whole, &resumed}) {
            drop_what_is_drawn(*r);
            for (const char* part : {"window", "total"})
                for (const char* field : {"frames",
                                          "frame_errors",
                                          "fer",
                                          "fer_low",
                                          "fer_high",
                                          "frames_excluded",
                                          "frame_dispersion"})
                    (*r)[part].erase(field);
        }
        SCOPED_TRACE(name);
        expect_same(whole, resumed);
        EXPECT_EQ(resumed["sequence"], 19u);
    }
}

/// Live traffic, and symbols known only by decoding: the samples that wait for their gauge are carried too.
TEST_F(Resume, LiveTrafficIsGaugedAsIfNothingHadBeen)
{
    const auto set = named_set("qam:16");
    auto s = simulate(set, 20 * window, 14, 8);
    for (std::size_t k = 0; k < s.reference.size(); ++k)
        if (k % 500 >= 450)
            s.reference[k] |= decoded_flag;
        else if (k % 500 >= 50)
            s.reference[k] = live_code;
    auto options = options_of();
    options.trial.frame_symbols = 0;
    auto whole = run(set, s, options, 0, s.samples.size());
    const auto log = path("live.jsonl");
    options.resume = log;
    run(set, s, options, 0, 7 * window, log);
    auto resumed = run(set, s, options, 7 * window, s.samples.size(), log);
    drop_what_is_drawn(whole);
    drop_what_is_drawn(resumed);
    expect_same(whole, resumed);
    EXPECT_EQ(resumed["total"]["live_part"]["symbols"], 16 * window);
    EXPECT_EQ(resumed["total"]["decoded_part"]["symbols"], 2 * window);
}

TEST_F(Resume, FramesGoOnExceptTheOneUnderWay)
{
    const auto set = named_set("psk:4");
    const auto s = simulate(set, 4 * window, 8, 1);
    const auto whole = run(set, s, options_of(), 0, s.samples.size());
    const auto log = path("f.jsonl");
    run(set, s, options_of(), 0, 2 * window, log);
    auto resumed = run(set, s, options_of(log), 2 * window, s.samples.size(), log);
    EXPECT_EQ(whole["total"]["frames"], resumed["total"]["frames"]); // all symbols judged: no frame is cut
    EXPECT_EQ(whole["total"]["frame_errors"], resumed["total"]["frame_errors"]);
    run(set, s, options_of(), 0, 2 * window - 1, log);
    resumed = run(set, s, options_of(log), 2 * window, s.samples.size(), log);
    EXPECT_EQ(whole["total"]["frames"].get<int>() - 1, resumed["total"]["frames"].get<int>());
}

TEST_F(Resume, SurvivesKill9AtAnyMoment)
{
    // The child counts for ever in pieces; what the log's last line says was judged is where the parent goes
    // on.
    const auto set = named_set("qam:16");
    const auto s = simulate(set, 200 * window, 14, 5);
    const auto log = path("killed.jsonl");
    for (int kill_after = 1; kill_after <= 3; ++kill_after) {
        std::uint64_t from = 0;
        if (std::ifstream file(report_log::carry_path(log)); file)
            from = nlohmann::json::parse(file)["sums"]["counts"]["symbols"];
        const pid_t child = ::fork();
        ASSERT_GE(child, 0);
        if (child == 0) {
            run(set, s, options_of(log), from, s.samples.size(), log);
            ::_exit(0);
        }
        while (!fs::exists(log) || fs::file_size(log) < static_cast<std::uintmax_t>(kill_after) * 30000)
            ::usleep(1000);
        ::kill(child, SIGKILL);
        int status = 0;
        ::waitpid(child, &status, 0);
        ASSERT_TRUE(WIFSIGNALED(status)) << "the child was too fast: nothing was interrupted";
        // Each line is whole, but for one that was being written; each was on disk before the next report was
        // made.
        std::ifstream lines(log);
        std::vector<std::uint64_t> sequence;
        for (std::string line; std::getline(lines, line);)
            if (const auto read = nlohmann::json::parse(line, nullptr, false);
                read.is_object() && read.contains("sequence"))
                sequence.push_back(read["sequence"]);
        for (std::size_t k = 1; k < sequence.size(); ++k)
            EXPECT_LE(sequence[k] - sequence[k - 1], 2u); // one whose state was kept and whose line was not
    }
    std::ifstream file(report_log::carry_path(log));
    const std::uint64_t from = nlohmann::json::parse(file)["sums"]["counts"]["symbols"];
    ASSERT_LT(from, s.samples.size());
    auto resumed = run(set, s, options_of(log), from, s.samples.size(), log);
    auto whole = run(set, s, options_of(), 0, s.samples.size());
    drop_what_is_drawn(whole);
    drop_what_is_drawn(resumed);
    expect_same(whole, resumed);
    EXPECT_GT(*resumed["verdict"]["log_wealth_pass"].get_ptr<double*>(), 0);
}

TEST_F(Resume, OtherSettingsAreRefusedByName)
{
    const auto set = named_set("qam:16");
    const auto s = simulate(set, window, 14, 5);
    const auto log = path("o.jsonl");
    run(set, s, options_of(), 0, window, log);
    EXPECT_EQ(refusal(set, options_of(log)), "accepted");
    auto o = options_of(log);
    o.trial.target = "ber:0.02";
    EXPECT_EQ(refusal(set, o), "resume: target was \"ber:0.01\" in the earlier run, is \"ber:0.02\"");
    o = options_of(log);
    o.symbol_rate = 0;
    EXPECT_EQ(refusal(set, o), "resume: symbol_rate was 1000.0 in the earlier run, is absent");
    o = options_of(log);
    o.confidence = 0.9;
    EXPECT_EQ(refusal(set, o), "resume: confidence was 0.95 in the earlier run, is 0.9");
    EXPECT_EQ(refusal(named_set("psk:4"), options_of(log)),
              "resume: the number of labels was 16 in the earlier run, is 4");
    auto labels = set.labels();
    std::swap(labels[2], labels[3]);
    EXPECT_EQ(refusal(set.relabelled(labels), options_of(log)).substr(0, 23), "resume: labels[2] was \"");
}

TEST_F(Resume, WhatCannotBeReadIsRefusedByName)
{
    const auto set = named_set("qam:16");
    const auto s = simulate(set, window, 14, 5);
    const auto log = path("b.jsonl"), carry = report_log::carry_path(log);
    EXPECT_EQ(refusal(set, options_of(log)), "accepted"); // no log: a new run
    run(set, s, options_of(), 0, window, log);
    auto good = nlohmann::json::parse(std::ifstream(carry));
    fs::remove(carry);
    EXPECT_EQ(refusal(set, options_of(log)),
              "resume: " + carry + " cannot be read: No such file or directory");
    std::ofstream(carry) << "{\"schema\": \"halfplane/carry";
    EXPECT_EQ(refusal(set, options_of(log)),
              "resume: " + carry + " is not the state of a run (halfplane/carry/1)");
    auto bad = good;
    bad["sums"]["counts"]["sent"].erase(3);
    std::ofstream(carry) << bad;
    EXPECT_EQ(refusal(set, options_of(log)), "resume: sums: counts: sent: 15 values, expected 16");
    bad = good;
    bad["sums"]["run"]["trial"]["bets"].erase("levels");
    std::ofstream(carry) << bad;
    EXPECT_NE(refusal(set, options_of(log)).find("levels"), std::string::npos);
    bad = good;
    bad["sums"]["counts"]["transitions"]["rows"] = {{99, 0, 1}};
    std::ofstream(carry) << bad;
    EXPECT_NE(refusal(set, options_of(log)).find("a transition reads [99,0,1]"), std::string::npos);
}
