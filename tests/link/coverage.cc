// SPDX-License-Identifier: GPL-3.0-or-later
// Coverage: how often the intervals of a report hold the truth, over 2,000 seeded links a set, and under
// bursts.
#include "simulated.h"

#include "halfplane/interval.h"
#include "halfplane/link/watch.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>

using namespace halfplane;
using namespace halfplane::link;
using namespace halfplane::testing;

namespace {

/// Three standard errors of a share of 95 % over so many links.
double tolerance(int links)
{
    return 3 * std::sqrt(0.95 * 0.05 / links);
}

report report_on(const signal_set& set, const simulated& s, double declared_db)
{
    watch measured(set, {});
    report last;
    const auto keep = [&](watch::window&& w) { last = measured.report_of(std::move(w)); };
    measured.set_input({declared_db});
    measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), keep);
    measured.close(keep);
    return last;
}

bool holds(const report& ends, const std::string& name, double truth)
{
    return ends.at(name + "_low") <= truth && truth <= ends.at(name + "_high");
}

/// Links at the Es/N0 where the exact SER is `ser`: intervals of SER, of BER, and of both shortfalls, which
/// are 0.
void expect_coverage(const signal_set& set, double ser, std::size_t symbols, int links)
{
    const predictor p(set);
    const double es_n0 = *p.es_n0_for_ser(ser), ber = p.ber(es_n0), db = to_db(es_n0);
    int of_ser = 0, of_ber = 0, of_decision = 0, of_input = 0;
    double width = 0, width_input = 0;
    for (int k = 0; k < links; ++k) {
        const auto last = report_on(set, simulate(set, symbols, db, 1 + static_cast<std::uint64_t>(k)), db);
        of_ser += holds(last["total"], "ser", ser);
        of_ber += holds(last["total"], "ber", ber);
        const auto& shortfalls = last["shortfall"];
        of_decision += holds(shortfalls["decision"], "db", 0);
        of_input += holds(shortfalls["input"], "db", 0);
        width += (shortfalls["decision"]["db_high"].get<double>() -
                  shortfalls["decision"]["db_low"].get<double>()) /
                 links;
        width_input +=
            (shortfalls["input"]["db_high"].get<double>() - shortfalls["input"]["db_low"].get<double>()) /
            links;
    }
    const auto percent = [&](int count) { return 100.0 * count / links; };
    std::cout << set.name() << " at SER " << ser << ", " << symbols << " symbols: coverage of SER "
              << percent(of_ser) << " %, BER " << percent(of_ber) << " %, shortfall at the decision "
              << percent(of_decision) << " % (mean width " << width << " dB), at the input "
              << percent(of_input) << " % (" << width_input << " dB)\n";
    EXPECT_NEAR(of_ser / double(links), 0.95, tolerance(links));
    EXPECT_NEAR(of_ber / double(links), 0.95, tolerance(links));
    EXPECT_NEAR(of_decision / double(links), 0.95, tolerance(links));
    EXPECT_NEAR(of_input / double(links), 0.95, tolerance(links));
}

} // namespace

TEST(Coverage, Gray16Qam)
{
    expect_coverage(named_set("qam:16"), 0.03, 15000, 2000);
}

TEST(Coverage, TwelvePointsWithNaturalLabels)
{
    expect_coverage(
        load_set(std::string(HALFPLANE_SOURCE_DIR) + "/examples/sets/firn-12.json"), 0.03, 15000, 2000);
}

TEST(Coverage, ManyStretchesAtAHighSignalToNoiseRatio)
{
    // Eight stretches, where the curve is steep: scatter of the gauge would show as a shortfall.
    expect_coverage(named_set("qam:16"), 0.004, 80000, 400);
}

TEST(Coverage, BurstsWidenTheIntervals)
{
    // Bursts of 20 symbols in which the sample is noise alone. The binomial interval would hold the truth in
    // about 60 % of the links; what is asked here is 95 % within four standard errors below (400 links), and
    // any excess above.
    const auto set = named_set("psk:4");
    const double db = 12, in_burst = 0.75, start = 0.0005;
    const predictor p(set);
    const std::size_t n = 100000, length = 20;
    int of_ser = 0, of_ber = 0, of_binomial = 0, widened = 0;
    const int runs = 400;
    for (int k = 0; k < runs; ++k) {
        const auto seed = 77000 + static_cast<std::uint64_t>(k);
        auto s = simulate(set, n, db, seed);
        std::mt19937_64 random(seed);
        std::bernoulli_distribution begins(start);
        for (std::size_t j = 0; j < n; ++j)
            if (begins(random))
                for (const std::size_t end = std::min(n, j + length); j < end; ++j)
                    s.samples[j] = {static_cast<float>(random() % 2) - 0.5f,
                                    static_cast<float>(random() % 2) - 0.5f};
        // Renewal: a cycle is a gap of mean 1/start − 1 symbols, then the burst and the symbol after it,
        // which is drawn as in the gap.
        const double share = length / (length + 1 / start);
        const double ser = share * in_burst + (1 - share) * p.ser(from_db(db));
        const double ber = share * 0.5 + (1 - share) * p.ber(from_db(db));
        const auto last = report_on(set, s, db);
        const auto& total = last["total"];
        of_ser += holds(total, "ser", ser);
        of_ber += holds(total, "ber", ber);
        widened += total.value("dispersion", 1.0) > 1;
        const auto plain = binomial_interval(total["symbol_errors"], total["symbols"], 0.95);
        of_binomial += *plain.low <= ser && ser <= plain.high;
    }
    std::cout << "bursts of 20: coverage of SER " << of_ser / 4.0 << " %, BER " << of_ber / 4.0
              << " %; binomial " << of_binomial / 4.0 << " %; widened in " << widened << " of " << runs
              << '\n';
    EXPECT_GE(of_ser / double(runs), 0.95 - 4 * std::sqrt(0.95 * 0.05 / runs));
    EXPECT_GE(of_ber / double(runs), 0.95 - 4 * std::sqrt(0.95 * 0.05 / runs));
    EXPECT_LE(of_binomial / double(runs), 0.8);
    EXPECT_EQ(widened, runs);
}
