// SPDX-License-Identifier: GPL-3.0-or-later
// end_to_end: six sets through everything a link does to them, from the samples to the report: no symbol is
// lost from the account, every reference is what was sent, the totals are those of an offline count, and the
// rates are the exact ones.
#include "align_link.h"

#include "halfplane/geometry.h"
#include "halfplane/interval.h"
#include "halfplane/link/watch.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cctype>
#include <cstdio>
#include <limits>
#include <random>

using namespace align_test;
using halfplane::exclusion;
using halfplane::reference_t;
using halfplane::link::report;
using halfplane::link::watch;
using halfplane::link::watch_options;

namespace {

constexpr std::size_t count = 24000;

/// Sixteen points of a square with Maxwell–Boltzmann priors.
signal_set shaped16()
{
    const auto square = halfplane::load_set("qam:16");
    std::vector<double> priors;
    double sum = 0;
    for (const auto& s : square.points())
        sum += priors.emplace_back(std::exp(-std::norm(s) / 12));
    for (auto& p : priors)
        p /= sum;
    return signal_set(square.points(), square.labels(), square.label_bits(), priors, "shaped-16");
}

struct kind {
    const char* name;
    const char* pattern;
    double es_n0_db; ///< SER near 1e-2
};

const kind kinds[] = {{"psk:2", "o150:23", 4.5},
                      {"firn-12", "draw:7:5000", 14},
                      {"hex:19", "draw:9", 16},
                      {"shaped-16", "draw:11", 16},
                      {"qam:64", "o150:31", 22},
                      {"qam:4096", "draw:5:20000", 40}};

signal_set set_of(const kind& k)
{
    const std::string name = k.name;
    return name == "firn-12" ? firn12() : name == "shaped-16" ? shaped16() : halfplane::load_set(name);
}

/// A link of one set: each stream goes through an aligner of its own and into one watch and one offline
/// count.
class bench
{
public:
    explicit bench(const kind& k)
        : d_kind(k), d_set(set_of(k)), d_known(k.pattern, d_set), d_watch(d_set, options())
    {
        // MAP decisions know N0 from what stands ahead of the receiver until a window has closed.
        d_watch.set_input({k.es_n0_db, 0, false});
    }

    const signal_set& set() const { return d_set; }
    const pattern& known() const { return d_known; }
    const kind& what() const { return d_kind; }

    channel usual(std::uint64_t seed) const
    {
        channel c;
        c.es_n0_db = d_kind.es_n0_db;
        c.gain = std::polar(0.4, 0.1);
        c.seed = seed;
        return c;
    }

    /// Takes a stream whose sample k carries sent[k] (or nothing: a negative number).
    outcome take(const std::vector<sample>& r, const std::vector<int>& sent)
    {
        aligner a(d_set, d_known);
        auto o = run(a, r);
        EXPECT_TRUE(o.lengths_hold);
        EXPECT_EQ(o.judged() + o.count(exclusion::before_lock) + o.count(exclusion::slip) +
                      o.count(exclusion::signal_lost) + o.count(exclusion::overflow),
                  r.size());
        for (std::size_t k = 0; k < r.size(); ++k)
            d_wrong += o.reference[k] >= 0 && o.reference[k] != sent[k];
        d_watch.add(o.out.data(), o.reference.data(), nullptr, r.size(), [&](watch::window&& w) {
            report_of(std::move(w));
        });
        count_offline(o);
        d_in += r.size();
        return o;
    }
    outcome take(const std::vector<sample>& r, const std::vector<std::uint16_t>& sent)
    {
        return take(r, std::vector<int>(sent.begin(), sent.end()));
    }

    /// Judged symbols whose reference is not what was sent.
    std::uint64_t wrong() const { return d_wrong; }

    /// The account and the counts of the whole run.
    report total()
    {
        d_watch.close([&](watch::window&& w) { report_of(std::move(w)); }, true);
        const auto& t = d_last.at("total");
        const auto& x = t.at("excluded");
        EXPECT_EQ(t.at("in"), d_in);
        EXPECT_EQ(t.at("judged"), d_offline.symbols);
        EXPECT_EQ(t.at("nonfinite"), d_offline.nonfinite);
        EXPECT_EQ(t.at("pending"), 0u);
        const char* causes[] = {"before_lock", "slip", "signal_lost", "overflow"};
        for (int e = 0; e < 4; ++e)
            EXPECT_EQ(x.at(causes[e]), d_offline.excluded[e]) << causes[e];
        if (d_set.uniform()) { // MAP decisions are not the nearest points
            EXPECT_EQ(t.at("symbol_errors"), d_offline.symbol_errors);
            EXPECT_EQ(t.at("bit_errors"), d_offline.bit_errors);
        }
        return t;
    }

    /// The exact rate at the true Es/N0 lies inside an interval of counted errors, at one in a million. The
    /// correction follows from past symbols only and costs a little: so much Es/N0 more or less is allowed.
    void expect_exact_rate(const report& t) const
    {
        const auto& p = halfplane::predictor(d_set);
        const auto ends = halfplane::binomial_interval(t.at("symbol_errors"), t.at("judged"), 1 - 1e-6);
        const double loss_db =
            4.34 * 2.0 / 1000; // gain and phase from 2,000 symbols, frequency as much again
        const auto ser = [&](double db) { return p.at(halfplane::from_db(d_kind.es_n0_db + db)).exact.ser; };
        EXPECT_LT(ends.low.value_or(0), ser(-2 * loss_db));
        EXPECT_GT(ends.high, ser(0));
    }

private:
    static watch_options options()
    {
        watch_options o;
        o.window = 200000;
        o.clock = [] { return "2026-01-01T00:00:00Z"; };
        return o;
    }
    /// Index of the nearest point; on a square grid by rounding, so that 4,096 points need no search.
    std::size_t nearest(sample r) const
    {
        const complex z(r);
        if (std::string(d_kind.name).rfind("qam:", 0) == 0) {
            const auto side = static_cast<long>(std::lround(std::sqrt(static_cast<double>(d_set.size()))));
            const auto at = [&](double x) { // level …, −3, −1, 1, 3, … by its number from the left
                return std::clamp(std::lround((x + static_cast<double>(side - 1)) / 2), 0L, side - 1);
            };
            return static_cast<std::size_t>(at(z.imag()) * side + at(z.real())); // by row from the lower left
        }
        std::size_t best = 0;
        for (std::size_t i = 1; i < d_set.size(); ++i)
            if (std::norm(z - d_set.points()[i]) < std::norm(z - d_set.points()[best]))
                best = i;
        return best;
    }

    void count_offline(const outcome& o)
    {
        for (std::size_t k = 0; k < o.out.size(); ++k) {
            const auto sent = o.reference[k];
            if (sent < 0) {
                ++d_offline.excluded[-1 - sent];
            } else if (!std::isfinite(o.out[k].real()) || !std::isfinite(o.out[k].imag())) {
                ++d_offline.nonfinite;
            } else {
                const auto decided = nearest(o.out[k]);
                const auto i = static_cast<std::size_t>(sent);
                ++d_offline.symbols;
                d_offline.symbol_errors += decided != i;
                d_offline.bit_errors += halfplane::label_distance(d_set.labels()[i], d_set.labels()[decided]);
            }
        }
    }

    void report_of(watch::window&& w) { d_last = d_watch.report_of(std::move(w)); }

    const kind d_kind;
    const signal_set d_set;
    const pattern d_known;
    watch d_watch;
    report d_last;
    struct {
        std::uint64_t symbols = 0, symbol_errors = 0, bit_errors = 0, nonfinite = 0, excluded[4] = {};
    } d_offline;
    std::uint64_t d_in = 0, d_wrong = 0;
};

class EndToEnd : public testing::TestWithParam<kind>
{
};

} // namespace

INSTANTIATE_TEST_SUITE_P(SixSets, EndToEnd, testing::ValuesIn(kinds), [](const auto& p) {
    std::string name = p.param.name;
    for (auto& c : name)
        c = std::isalnum(static_cast<unsigned char>(c)) ? c : '_';
    return name;
});

TEST_P(EndToEnd, TwoHundredDelaysFromAnyGainPhaseAndFrequency)
{
    bench b(GetParam());
    const bool may_mirror = b.set().size() > 2;
#ifdef __SANITIZE_ADDRESS__
    constexpr std::uint64_t tries = 20; // ten times slower, and a fault of memory shows in the first
#else
    constexpr std::uint64_t tries = 200;
#endif
    for (std::uint64_t seed = 1; seed <= tries; ++seed) {
        const try_of t(seed, b.what().es_n0_db, b.known(), may_mirror, false);
        const auto sent = symbols(b.set(), b.known(), t.start, 9000);
        const auto o = b.take(through(b.set(), sent, t.c), sent);
        ASSERT_LT(first_lock(o), 9000u) << seed;
        ASSERT_EQ(o.status.state, halfplane::link::lock_state::held) << seed;
        ASSERT_EQ(o.status.slips, 0u) << seed;
    }
    EXPECT_EQ(b.wrong(), 0u);
    const auto t = b.total();
    std::printf("%s: %llu judged of %llu, SER %.4g\n",
                b.what().name,
                t.at("judged").get<unsigned long long>(),
                t.at("in").get<unsigned long long>(),
                t.at("ser").get<double>());
    b.expect_exact_rate(t);
}

TEST_P(EndToEnd, EverySymmetryOfTheSet)
{
    bench b(GetParam());
    const auto all = halfplane::symmetries(b.set());
    std::uint64_t seed = 1;
    for (std::size_t s = 0; s < all.size(); ++s) {
        auto c = b.usual(seed++);
        c.mirrored = all[s].mirrored; // conj(gain·s), so the angle enters with its sign turned
        c.gain = std::polar(0.4, (c.mirrored ? -1 : 1) * (all[s].angle_rad + 0.1));
        const auto sent = symbols(b.set(), b.known(), 100 * s, 9000);
        const auto o = b.take(through(b.set(), sent, c), sent);
        ASSERT_LT(first_lock(o), 9000u) << s;
    }
    EXPECT_EQ(b.wrong(), 0u);
    b.expect_exact_rate(b.total());
    std::printf("%s: %zu symmetries\n", b.what().name, all.size());
}

TEST_P(EndToEnd, InvertedBits)
{
    bench b(GetParam());
    if (!b.known().carries_bits()) {
        // Indices drawn by prior are no bits: there is nothing to invert, and the complement of a label may
        // be none.
        EXPECT_EQ(b.what().pattern[0], 'd');
        return;
    }
    // With two points half a turn inverts all bits: the turn is reported, and the pattern is as it was.
    const bool turned = b.set().size() == 2;
    const auto inverted = symbols(b.set(), b.known(), 77, count, true);
    const auto o = b.take(through(b.set(), inverted, b.usual(1)),
                          turned ? symbols(b.set(), b.known(), 77, count) : inverted);
    ASSERT_LT(first_lock(o), 9000u);
    EXPECT_EQ(o.status.inverted, !turned);
    EXPECT_EQ(o.status.rotation_deg, turned ? 180 : 0);
    EXPECT_EQ(b.wrong(), 0u);
    b.expect_exact_rate(b.total());
}

TEST_P(EndToEnd, FrequencyOffsets)
{
    bench b(GetParam());
    std::uint64_t seed = 1;
    for (double f : {-1e-4, -3e-5, 1e-6, 1e-4}) {
        auto c = b.usual(seed++);
        c.frequency = f;
        const auto sent = symbols(b.set(), b.known(), seed * 1000, count);
        const auto o = b.take(through(b.set(), sent, c), sent);
        ASSERT_LT(first_lock(o), 9000u) << f;
        // Twice the bound of Rife and Boorstyn for 2,048 symbols would do; 4e-6 is wide of it at any SNR
        // here.
        EXPECT_NEAR(o.status.frequency, f, 4e-6);
    }
    EXPECT_EQ(b.wrong(), 0u);
    b.expect_exact_rate(b.total());
}

TEST_P(EndToEnd, Slips)
{
    bench b(GetParam());
    for (int shift : {-7, -1, 1, 5}) { // symbols lost; negative: put in
        auto indices = symbols(b.set(), b.known(), 500, count + 10);
        auto r = through(b.set(), indices, b.usual(3));
        std::vector<int> sent(indices.begin(), indices.end());
        const auto at = static_cast<std::ptrdiff_t>(12000);
        if (shift > 0) {
            r.erase(r.begin() + at, r.begin() + at + shift);
            sent.erase(sent.begin() + at, sent.begin() + at + shift);
        } else {
            const auto n = static_cast<std::size_t>(-shift);
            const auto more = through(b.set(), symbols(b.set(), b.known(), 9999, n), b.usual(4));
            r.insert(r.begin() + at, more.begin(), more.end());
            sent.insert(sent.begin() + at, n, -9);
        }
        r.resize(count);
        sent.resize(count);
        const auto o = b.take(r, sent);
        EXPECT_EQ(o.status.slips, 1u) << shift;
        EXPECT_EQ(o.count(exclusion::signal_lost), 0u) << shift;
        EXPECT_LE(o.count(exclusion::slip), 60u) << shift;
        for (const auto& e : o.events)
            if (e.status.slips == 1) {
                EXPECT_NEAR(static_cast<double>(e.symbol), 12000, 60) << shift;
            }
    }
    // Next to a split, old and new may agree with what was received equally well.
    EXPECT_LE(b.wrong(), 4 * 8u);
    b.total();
}

TEST_P(EndToEnd, SignalLostAndBack)
{
    bench b(GetParam());
    const auto sent = symbols(b.set(), b.known(), 40, 2 * count);
    auto r = through(b.set(), sent, b.usual(5));
    // The transmitter goes away for longer than the hold-back: noise is all that is left.
    const auto n0 = b.set().es() * halfplane::from_db(-b.what().es_n0_db) * 0.16;
    std::vector<sample> noise(12000);
    halfplane::kernels::complex_noise(9).draw(0, noise.size(), n0, noise.data());
    std::copy(noise.begin(), noise.end(), r.begin() + 15000);
    const auto o = b.take(r, sent);
    EXPECT_EQ(o.status.state, halfplane::link::lock_state::held);
    EXPECT_GT(o.count(exclusion::signal_lost), 11000u);
    EXPECT_LT(o.count(exclusion::signal_lost), 12000u + 9000u);
    EXPECT_EQ(o.count(exclusion::slip), 0u);
    EXPECT_EQ(b.wrong(), 0u); // the delay is the same afterwards
    b.total();
}

TEST_P(EndToEnd, NotANumberInBursts)
{
    bench b(GetParam());
    const auto sent = symbols(b.set(), b.known(), 40, count);
    auto r = through(b.set(), sent, b.usual(6));
    const float bad[] = {std::numeric_limits<float>::quiet_NaN(), std::numeric_limits<float>::infinity()};
    std::uint64_t put_in = 0;
    for (std::size_t first : {10000u, 15000u, 20000u})
        for (std::size_t k = first; k < first + 50; ++k, ++put_in)
            r[k] = k % 2 ? sample(bad[k % 3 % 2], 0) : sample(0.1f, bad[k % 3 % 2]);
    const auto o = b.take(r, sent);
    EXPECT_EQ(o.status.slips, 0u);
    EXPECT_EQ(b.wrong(), 0u);
    const auto t = b.total();
    EXPECT_EQ(t.at("nonfinite"), put_in);
    b.expect_exact_rate(t);
}

TEST_P(EndToEnd, GainSteps)
{
    bench b(GetParam());
    const auto sent = symbols(b.set(), b.known(), 40, 72000);
    auto r = through(b.set(), sent, b.usual(7));
    const auto step_at = [&](std::size_t first, double by) {
        for (std::size_t k = first; k < r.size(); ++k)
            r[k] *= static_cast<float>(by);
    };
    step_at(15000, 2.0);
    step_at(30000, 0.4);
    const auto o = b.take(r, sent);
    // A step is the link's own fault: what it costs is judged, never left out.
    EXPECT_EQ(o.count(exclusion::slip) + o.count(exclusion::signal_lost), 0u);
    EXPECT_EQ(o.status.state, halfplane::link::lock_state::held);
    EXPECT_EQ(b.wrong(), 0u);
    // Seventeen lengths of the correction's memory after the last step all is as it was.
    EXPECT_NEAR(static_cast<double>(errors(b.set(), o, 64000, 72000)),
                static_cast<double>(errors(b.set(), o, 7000, 15000)),
                6 * std::sqrt(2.0 * static_cast<double>(errors(b.set(), o, 7000, 15000)) + 4));
    b.total();
}
