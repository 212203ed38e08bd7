// SPDX-License-Identifier: GPL-3.0-or-later
// blind_gauge: any gain and offset, what decisions would have made of it, where there is nothing to say, and
// which samples are kept. Bias and variance stand in tests/published/blind_bound.cc.
#include "halfplane/blind_gauge.h"

#include "halfplane/carry.h"
#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <random>

using namespace halfplane;

namespace {

using samples = std::vector<std::complex<float>>;

samples
traffic(const signal_set& set, std::size_t n, double es_n0_db, complex gain, complex offset, unsigned seed)
{
    std::mt19937_64 random(seed);
    std::normal_distribution<double> normal(0, std::sqrt(std::norm(gain) * set.es() / from_db(es_n0_db) / 2));
    std::discrete_distribution<std::size_t> index(set.priors().begin(), set.priors().end());
    samples out;
    for (std::size_t k = 0; k < n; ++k)
        out.emplace_back(gain * set.points()[index(random)] + offset +
                         complex(normal(random), normal(random)));
    return out;
}

samples kept_of(const samples& all, std::size_t piece, std::size_t merge_after)
{
    thinned_samples sum, open;
    for (std::size_t k = 0; k < all.size(); k += piece) {
        open.add(all.data() + k, k, std::min(piece, all.size() - k));
        if (open.seen() >= merge_after) {
            sum.merge(open);
            open = {};
        }
    }
    sum.merge(open);
    EXPECT_EQ(sum.seen(), all.size());
    return sum.kept();
}

} // namespace

/// Within 4.5 of the standard errors it claims, from far outside the detector's gain too.
TEST(BlindGauge, FindsGainOffsetAndNoise)
{
    for (const char* name : {"qam:16", "qam:256", "apsk:4+8:2.4", "psk:8", "cross:32", "qam:2"}) {
        const auto set = named_set(name);
        for (const double db : {14., 26.})
            for (const complex gain : {complex(1), complex(0.98, 0.02), complex(37), complex(0.004)}) {
                if (std::string(name) == "qam:256" && db < 20)
                    continue; // SER 0.8
                const complex offset = 0.05 * gain * std::sqrt(set.es());
                const auto fit = blind_gauge(set).solve(traffic(set, 20000, db, gain, offset, 5));
                ASSERT_TRUE(fit) << name << " " << db << " " << gain;
                EXPECT_NEAR(to_db(fit->es_n0), db, 4.5 * fit->es_n0_db_se) << name << " " << gain;
                EXPECT_LT(fit->es_n0_db_se, 0.2) << name;
                EXPECT_LT(std::abs(fit->gain / gain - 1.), 0.02) << name << " " << gain;
                EXPECT_LT(std::abs((fit->offset - offset) / gain), 0.02 * std::sqrt(set.es())) << name;
                EXPECT_NEAR(fit->n0 / (std::norm(gain) * set.es() / from_db(db)), 1, 0.1) << name;
                EXPECT_EQ(fit->samples, 20000u);
            }
    }
}

/// What is rejected: residuals against decisions. At SER 0.3 they read more than 1 dB high.
TEST(BlindGauge, DecisionsWouldReadHigh)
{
    const auto set = named_set("qam:16");
    const auto seen = traffic(set, 20000, 8.7, 1, 0, 3);
    double n0 = 0;
    for (const auto& r : seen) {
        double nearest = 1e300;
        for (const auto& s : set.points())
            nearest = std::min(nearest, std::norm(complex(r) - s));
        n0 += nearest / 20000;
    }
    EXPECT_GT(to_db(set.es() / n0), 9.7);
    EXPECT_NEAR(to_db(blind_gauge(set).solve(seen)->es_n0), 8.7, 0.3);
}

TEST(BlindGauge, AStartTellsOneTurnFromAnother)
{
    const auto set = named_set("qam:16");
    const complex quarter(0, 1);
    const auto seen = traffic(set, 20000, 20, quarter, 0, 9);
    EXPECT_LT(std::abs(blind_gauge(set).solve(seen)->gain - 1.), 0.02); // the same picture
    // A set that no turn carries into itself: a start leads to the turn that is there.
    const auto odd = signal_set::with_natural_labels({{1, 1}, {-1, 1}, {-3, -1}, {1, -2}, {0.3, 0.1}});
    const auto turned = traffic(odd, 20000, 16, quarter, 0, 9);
    const auto fit = blind_gauge(odd).solve(turned, {{quarter, 0, 0.1}});
    ASSERT_TRUE(fit);
    EXPECT_LT(std::abs(fit->gain - quarter), 0.03);
    EXPECT_NEAR(to_db(fit->es_n0), 16, 4.5 * fit->es_n0_db_se);
}

TEST(BlindGauge, SaysNothingWhereNothingIs)
{
    const auto set = named_set("qam:16");
    const blind_gauge gauge(set);
    EXPECT_FALSE(gauge.solve({}));
    EXPECT_FALSE(gauge.solve(traffic(set, 99, 20, 1, 0, 1)));
    EXPECT_TRUE(gauge.solve(traffic(set, 100, 20, 1, 0, 1)));
    EXPECT_FALSE(gauge.solve(samples(5000)));                    // silence
    EXPECT_FALSE(gauge.solve(samples(5000, {0.7f, -0.1f})));     // a carrier without noise
    EXPECT_FALSE(gauge.solve(traffic(set, 5000, 160, 1, 0, 1))); // no noise at all
    // Noise alone is some -10 dB or less, or nothing.
    for (unsigned seed = 1; seed < 20; ++seed) {
        auto noise = traffic(set, 5000, 0, 1, 0, seed);
        std::mt19937_64 random(seed);
        std::normal_distribution<float> normal;
        for (auto& r : noise)
            r = {normal(random), normal(random)};
        const auto fit = gauge.solve(noise);
        EXPECT_LT(fit ? to_db(fit->es_n0) : -100, 5) << seed;
    }
}

TEST(BlindGauge, KeepsTheSameSamplesHoweverTheStreamIsCut)
{
    samples all;
    for (int k = 0; k < 300000; ++k)
        all.emplace_back(static_cast<float>(k), 0.f);
    const auto whole = kept_of(all, all.size(), all.size());
    EXPECT_LE(whole.size(), thinned_samples::capacity);
    EXPECT_GE(whole.size(), thinned_samples::capacity / 2 - 1000);
    for (const std::size_t piece : {std::size_t{1}, std::size_t{977}, std::size_t{40000}})
        EXPECT_EQ(kept_of(all, piece, 50000), whole) << piece;
    // All of a short stream.
    all.resize(10000);
    EXPECT_EQ(kept_of(all, 1000, 3000), all);
}

TEST(BlindGauge, NothingPeriodicDecidesWhatIsKept)
{
    // A frame of 128 symbols: each place within it is kept equally often, within 4.5 deviations.
    thinned_samples t;
    const int frames = 1 << 14;
    for (int k = 0; k < 128 * frames; ++k) {
        const std::complex<float> place(static_cast<float>(k % 128), 0);
        t.add(&place, static_cast<std::uint64_t>(k), 1);
    }
    std::vector<double> times(128);
    for (const auto& r : t.kept())
        ++times[static_cast<std::size_t>(r.real())];
    const double expected = static_cast<double>(t.kept().size()) / 128;
    for (const double n : times)
        EXPECT_NEAR(n, expected, 4.5 * std::sqrt(expected));
}

TEST(BlindGauge, SamplesAreCarriedToTheBit)
{
    const auto set = named_set("qam:16");
    const auto seen = traffic(set, 70000, 14, 1, 0, 2);
    thinned_samples before, restored;
    before.add(seen.data(), 0, 40000);
    const auto document = carry_writer::document(before);
    carry_reader::read(document, restored);
    before.add(seen.data() + 40000, 40000, 30000);
    restored.add(seen.data() + 40000, 40000, 30000);
    EXPECT_EQ(restored.kept(), before.kept());
    EXPECT_EQ(restored.seen(), before.seen());
}
