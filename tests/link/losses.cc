// SPDX-License-Identifier: GPL-3.0-or-later
// losses: causes named, and what each costs, against links simulated with and without the cause.
#include "halfplane/link/watch.h"
#include "impaired.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <map>
#include <set>
#include <tuple>

using namespace halfplane;
using namespace halfplane::link;
using namespace halfplane::testing;

namespace {

constexpr std::size_t symbols = 400000;
constexpr double cost_tolerance = 0.1; // dB, as promised
constexpr double heard = 0.02;         // dB: a row of at least so much names a cause

/// Final report over the stream, and where asked the shortfall at the input from an offline count.
report report_on(const signal_set& set, const simulated& s, double es_n0_db, bool input_known = true)
{
    watch measured(set, {});
    report last;
    if (input_known)
        measured.set_input({es_n0_db});
    measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), [&](watch::window&& w) {
        last = measured.report_of(std::move(w));
    });
    measured.close([&](watch::window&& w) { last = measured.report_of(std::move(w), true); }, true);
    return last;
}

/// Es/N0 at which the exact curve gives the SER that a plain count finds.
double achieved_db(const signal_set& set, const simulated& s)
{
    const auto counted = count_offline(set, s, s.samples.size());
    return to_db(*predictor(set).es_n0_for_ser(static_cast<double>(counted.symbol_errors) /
                                               static_cast<double>(counted.symbols)));
}

std::map<std::string, double> costs_of(const report& last)
{
    std::map<std::string, double> out;
    for (const auto& row : last.at("losses"))
        out[row["cause"]] = row["cost_db"];
    return out;
}

using mending = std::pair<const char*, void (*)(faults&)>;
const mending mend[] = {
    {"phase_error", [](faults& f) { f.phase_deg = 0; }},
    {"gain_error", [](faults& f) { f.gain = 1; }},
    {"phase_noise", [](faults& f) { f.phase_noise_deg = 0; }},
    {"iq_imbalance", [](faults& f) { f.imbalance_db = 0; }},
    {"offset", [](faults& f) { f.offset = 0; }},
    {"compression", [](faults& f) { f.compression = 0; }},
    {"echo", [](faults& f) { f.echo = 0; }},
    {"timing", [](faults& f) { f.delay = 0; }},
    {"filter", [](faults& f) { f.receive_roll_off = 0; }},
};

bool differs(const faults& a, const faults& b)
{
    return a.phase_deg != b.phase_deg || a.gain != b.gain || a.phase_noise_deg != b.phase_noise_deg ||
           a.imbalance_db != b.imbalance_db || a.offset != b.offset || a.compression != b.compression ||
           a.echo != b.echo || a.delay != b.delay || a.receive_roll_off != b.receive_roll_off;
}

struct accuracy {
    double worst_cost = 0, worst_rest = 0;
};

/*!
 * Every cause that is in the link is a row whose cost is what the link gains without it, no other cause is
 * heard, the rows add up to the shortfall, and little of it stays unexplained.
 */
void expect_explained(const signal_set& set, double es_n0_db, faults f, accuracy& reached)
{
    if (f.delay != 0 || f.receive_roll_off > 0)
        f.shaped = true;
    const auto link = simulate(set, symbols, es_n0_db, f, 42);
    const auto last = report_on(set, link, es_n0_db);
    auto costs = costs_of(last);
    const double with_all = achieved_db(set, link);
    SCOPED_TRACE(set.name() + " " + last["losses"].dump());

    std::set<std::string> injected, named;
    for (const auto& [name, repair] : mend) {
        faults without = f;
        repair(without);
        if (!differs(f, without))
            continue;
        injected.insert(name);
        const auto gained_by = [&](const faults& g) {
            return achieved_db(set, simulate(set, symbols, es_n0_db, g, 42)) - with_all;
        };
        double low = gained_by(without), high = low;
        if (f.receive_roll_off > 0 && without.receive_roll_off == 0) {
            // Which of the two pulses is the wrong one, the symbols cannot tell; with another cause beside,
            // it matters which is mended.
            without.roll_off = f.receive_roll_off;
            const double other = gained_by(without);
            std::tie(low, high) = std::minmax({low, other});
        }
        const double cost = costs[name], off = std::max({0.0, low - cost, cost - high});
        std::cout << "    " << name << ": " << cost << " dB, without it " << low << " … " << high
                  << " dB gained\n";
        EXPECT_LE(off, cost_tolerance) << name;
        reached.worst_cost = std::max(reached.worst_cost, off);
    }
    double sum = 0;
    for (const auto& [name, cost] : costs) {
        sum += cost;
        if (name != "excess_noise" && name != "interaction" && name != "unexplained" &&
            name != "coloured_noise" && std::abs(cost) >= heard)
            named.insert(name);
    }
    EXPECT_EQ(named, injected);
    const double shortfall = last["shortfall"]["input"]["db"];
    EXPECT_NEAR(shortfall, es_n0_db - with_all, 1e-6);
    EXPECT_NEAR(sum, shortfall, 1e-6);
    std::cout << "    unexplained " << costs["unexplained"] << " of " << shortfall << " dB; excess_noise "
              << costs["excess_noise"] << ", interaction " << costs["interaction"] << '\n';
    EXPECT_LE(std::abs(costs["unexplained"]), 0.1 * shortfall);
    reached.worst_rest = std::max(reached.worst_rest, std::abs(costs["unexplained"]) / shortfall);
}

void expect_explained(const char* name, double es_n0_db, const std::vector<faults>& all)
{
    const auto set = named_set(name);
    accuracy reached;
    for (const auto& f : all)
        expect_explained(set, es_n0_db, f, reached);
    std::cout << name << ": worst cost off by " << reached.worst_cost << " dB, worst rest "
              << 100 * reached.worst_rest << " % of the shortfall\n";
}

faults with(void (*change)(faults&))
{
    faults f;
    change(f);
    return f;
}

const faults turned = with([](faults& f) { f.phase_deg = 6; });
const faults jittered = with([](faults& f) { f.phase_noise_deg = 4; });
const faults unbalanced = with([](faults& f) { f.imbalance_db = 1.2; });
const faults shifted = with([](faults& f) { f.offset = {0.05, -0.04}; });
const faults compressed = with([](faults& f) { f.compression = 0.05; });
const faults echoed = with([](faults& f) {
    f.echo = std::polar(0.12, 0.8);
    f.echo_lag = 2;
});
const faults late = with([](faults& f) { f.delay = 0.125; });
const faults mismatched = with([](faults& f) {
    f.roll_off = 0.2;
    f.receive_roll_off = 0.6;
});

} // namespace

TEST(Losses, EachCauseOn16Qam)
{
    expect_explained(
        "qam:16", 16, {turned, jittered, unbalanced, shifted, compressed, echoed, late, mismatched});
}

TEST(Losses, CausesTogether)
{
    expect_explained("qam:16",
                     18,
                     {with([](faults& f) {
                          f.phase_deg = 3;
                          f.phase_noise_deg = 3;
                      }),
                      with([](faults& f) {
                          f.imbalance_db = 1;
                          f.offset = {0.04, 0.03};
                      }),
                      with([](faults& f) {
                          f.compression = 0.04;
                          f.echo = 0.1;
                      }),
                      with([](faults& f) {
                          f.delay = 0.0625;
                          f.phase_deg = 3;
                          f.phase_noise_deg = 2;
                      }),
                      with([](faults& f) {
                          f.roll_off = 0.2;
                          f.receive_roll_off = 0.6;
                          f.echo = complex(0, 0.08);
                          f.echo_lag = 3;
                      }),
                      with([](faults& f) {
                          f.delay = 0.0625;
                          f.roll_off = 0.2;
                          f.receive_roll_off = 0.6;
                      })});
}

TEST(Losses, AGainControlHidesNoCause)
{
    std::vector<faults> all = {compressed, late, mismatched, jittered};
    for (auto& f : all)
        f.gain_control = true;
    expect_explained("qam:16", 16, all);
}

TEST(Losses, OtherSets)
{
    expect_explained("psk:8", 13, {turned, jittered, unbalanced, echoed, late});
    expect_explained("qam:64",
                     23,
                     {with([](faults& f) { f.phase_noise_deg = 1.5; }),
                      with([](faults& f) { f.compression = 0.015; }),
                      with([](faults& f) { f.echo = 0.05; })});
    expect_explained("cross:32", 20, {with([](faults& f) {
                         f.phase_noise_deg = 2;
                         f.compression = 0.02;
                     })});
}
