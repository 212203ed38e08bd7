// SPDX-License-Identifier: GPL-3.0-or-later
// reporter: the stream never waits, windows merge, nothing is lost, whenever it stops.
#include "halfplane/link/reporter.h"
#include "simulated.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <future>
#include <thread>

using namespace halfplane;
using namespace halfplane::link;
using namespace halfplane::testing;

namespace {

watch_options windows_of(std::uint64_t symbols)
{
    watch_options options;
    options.window = symbols;
    return options;
}

void expect_totals(const report& last, const offline_count& truth)
{
    const auto& total = last["total"];
    EXPECT_EQ(total["symbols"], truth.symbols);
    EXPECT_EQ(total["symbol_errors"], truth.symbol_errors);
    EXPECT_EQ(total["bit_errors"], truth.bit_errors);
    EXPECT_EQ(total["nonfinite"], truth.nonfinite);
    EXPECT_EQ(total["excluded"]["before_lock"], truth.excluded[0]);
    EXPECT_EQ(total["excluded"]["slip"], truth.excluded[1]);
    EXPECT_EQ(total["excluded"]["signal_lost"], truth.excluded[2]);
    EXPECT_EQ(total["excluded"]["overflow"], truth.excluded[3]);
    EXPECT_TRUE(last.value("final", false));
}

/// Everything in pieces of awkward lengths.
void feed(reporter& to, const simulated& s, std::size_t from, std::size_t end)
{
    for (std::size_t piece = 1; from < end; piece = piece * 7 % 1999 + 1) {
        const auto n = std::min(piece, end - from);
        to.add(&s.samples[from], &s.reference[from], nullptr, n);
        from += n;
    }
}

} // namespace

TEST(Reporter, TheStreamNeverWaitsAndWindowsMerge)
{
    // The first report holds the worker until the whole stream has been handed in: if add() waited for it,
    // this would never end.
    const auto set = named_set("qam:16");
    auto s = simulate(set, 50000, 12, 1);
    spoil(s);
    std::promise<void> all_in;
    auto gate = all_in.get_future().share();
    std::vector<report> made;
    reporter_options how;
    how.least_interval = 0;
    how.on_report = [&](const report& r) {
        made.push_back(r);
        gate.wait();
    };
    reporter measured(set, windows_of(1000), how);
    measured.add(s.samples.data(), s.reference.data(), nullptr, 1000);
    while (measured.reports() < 1)
        std::this_thread::yield();
    measured.add(&s.samples[1000], &s.reference[1000], nullptr, 49000);
    EXPECT_EQ(measured.merged_windows(), 48u) << "49 windows in one slot";
    all_in.set_value();
    measured.stop();

    expect_totals(made.back(), count_offline(set, s, s.samples.size()));
    ASSERT_LE(made.size(), 3u); // the first; the merged one; the empty last, or both in one
    EXPECT_EQ(made[0]["window"]["first_symbol"], 0u);
    EXPECT_EQ(made[1]["window"]["first_symbol"], 1000u);
    std::uint64_t in_windows = 0;
    for (const auto& r : made)
        in_windows += r["window"]["symbols"].get<std::uint64_t>();
    EXPECT_EQ(in_windows, made.back()["total"]["symbols"]);
}

TEST(Reporter, StoppedAtAnyMomentTheTotalsAreTheOfflineCount)
{
    for (const char* name : {"psk:2", "qam:16", "qam:4096"}) {
        const auto set = named_set(name);
        const predictor p(set);
        auto s = simulate(set, 40000, to_db(*p.es_n0_for_ser(0.2)), 2);
        spoil(s);
        const std::size_t all = s.samples.size();
        // Ends within a window, at its edge, before the first; a report on 4,096 points takes long enough to
        // try two.
        const auto ends = set.size() > 100 ? std::vector<std::size_t>{0, 23456}
                                           : std::vector<std::size_t>{0, 1, 4999, 5000, 23456, all};
        for (const std::size_t end : ends) {
            reporter_options how;
            how.least_interval = 0.001;
            reporter measured(set, windows_of(5000), how);
            feed(measured, s, 0, end);
            measured.stop();
            ASSERT_TRUE(measured.latest()) << name << ' ' << end;
            expect_totals(*measured.latest(), count_offline(set, s, end));
            EXPECT_EQ(measured.failures(), 0u) << measured.last_failure();
        }
    }
}

TEST(Reporter, EveryStopEndsWithAFinalReport)
{
    // The worker may be anywhere when stop() comes: waking, predicting, waiting. A thousand times.
    const auto set = named_set("psk:2");
    const auto s = simulate(set, 2000, 5, 12);
    reporter_options how;
    how.least_interval = 0;
    reporter measured(set, windows_of(7), how);
    for (std::size_t k = 0; k < 1000; ++k) {
        measured.start();
        measured.add(&s.samples[2 * k], &s.reference[2 * k], nullptr, 2);
        measured.stop();
        ASSERT_TRUE(measured.latest()->value("final", false)) << k;
        ASSERT_EQ((*measured.latest())["total"]["in"], 2 * k + 2);
    }
}

TEST(Reporter, GoesOnAfterStopAndStart)
{
    const auto set = named_set("psk:4");
    const auto s = simulate(set, 9000, 5, 3);
    reporter measured(set, windows_of(1000));
    feed(measured, s, 0, 3000);
    measured.stop();
    measured.stop();
    EXPECT_EQ((*measured.latest())["total"]["symbols"], 3000u);
    feed(measured, s, 3000, 6000); // while stopped
    measured.start();
    measured.start();
    feed(measured, s, 6000, 9000);
    measured.stop();
    expect_totals(*measured.latest(), count_offline(set, s, 9000));
}

TEST(Reporter, TwoAtOnceWithSettersFromElsewhere)
{
    const auto set = named_set("qam:16");
    const auto s = simulate(set, 60000, 10, 4), other = simulate(set, 60000, 14, 5);
    reporter_options how;
    how.least_interval = 0;
    reporter first(set, windows_of(500), how), second(set, windows_of(700), how);
    std::thread a([&] { feed(first, s, 0, 60000); }), b([&] { feed(second, other, 0, 60000); });
    std::thread setter([&] {
        for (int k = 0; k < 200; ++k) {
            for (auto* r : {&first, &second}) {
                r->set_input({10.0 + 0.01 * (k % 3), 0, k % 2 == 0});
                r->set_lock({lock_state::held, static_cast<std::uint64_t>(k)});
                r->set_pending(static_cast<std::uint64_t>(k));
                (void)r->latest();
                (void)r->reports();
            }
        }
    });
    a.join();
    b.join();
    setter.join();
    first.stop();
    second.stop();
    expect_totals(*first.latest(), count_offline(set, s, 60000));
    expect_totals(*second.latest(), count_offline(set, other, 60000));
    EXPECT_EQ((*first.latest())["total"]["pending"], 199u);
    EXPECT_EQ((*first.latest())["total"]["in"], 60199u);
    EXPECT_EQ((*first.latest())["lock"]["delay"], 199u);
    EXPECT_EQ(first.failures() + second.failures(), 0u);
}

TEST(Reporter, WhatACallbackThrowsGoesNoFurther)
{
    const auto set = named_set("psk:4");
    const auto s = simulate(set, 5000, 5, 6);
    reporter_options how;
    how.least_interval = 0;
    how.on_report = [](const report&) { throw std::runtime_error("no room on the screen"); };
    reporter measured(set, windows_of(1000), how);
    feed(measured, s, 0, 5000);
    measured.stop();
    EXPECT_EQ(measured.failures(), measured.reports());
    EXPECT_EQ(measured.last_failure(), "no room on the screen");
    expect_totals(*measured.latest(), count_offline(set, s, 5000));
}

TEST(Reporter, DestroyedWhileBusy)
{
    const auto set = named_set("qam:64");
    const auto s = simulate(set, 20000, 15, 7);
    for (int k = 0; k < 20; ++k) {
        std::uint64_t last = 0;
        reporter_options how;
        how.on_report = [&](const report& r) { last = r["total"]["in"]; };
        {
            reporter measured(set, windows_of(100), how);
            feed(measured, s, 0, static_cast<std::size_t>(1000 * k));
        }
        EXPECT_EQ(last, static_cast<std::uint64_t>(1000 * k));
    }
}

TEST(Reporter, RefusesAnIntervalThatIsNone)
{
    reporter_options how;
    how.least_interval = -1;
    EXPECT_THROW(reporter(named_set("psk:4"), {}, how), std::invalid_argument);
}
