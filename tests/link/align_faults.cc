// SPDX-License-Identifier: GPL-3.0-or-later
// align_faults: bursts, silence, slips, overflow and bad samples: what is judged, what is excluded, and by
// which cause.
#include "align_link.h"

#include <gtest/gtest.h>

#include <cstdio>
#include <limits>

using namespace align_test;
using halfplane::code;
using halfplane::exclusion;
using halfplane::link::correction;
using halfplane::link::lock_state;

namespace {

constexpr std::size_t count = 40000;
constexpr std::size_t fault = 20000;

struct kind {
    const char* set;
    const char* pattern;
    double es_n0_db;
};

/// Sets of several shapes, each with a pattern found by correlation or by parity, one of them at SER near
/// 0.3.
const kind kinds[] = {{"qam:16", "o150:23", 22},
                      {"firn-12", "draw:7", 18},
                      {"psk:8", "o150:15", 16},
                      {"psk:2", "o150:31", 9},
                      {"qam:64", "draw:3:5000", 15}};

signal_set set_of(const kind& k)
{
    return std::string(k.set) == "firn-12" ? firn12() : halfplane::load_set(k.set);
}

struct link_run {
    signal_set set;
    pattern known;
    std::vector<std::uint16_t> sent;
    std::vector<sample> r;
    explicit link_run(const kind& k, std::size_t symbols_ = count)
        : set(set_of(k)), known(k.pattern, set), sent(symbols(set, known, 12345, symbols_))
    {
        channel c;
        c.es_n0_db = k.es_n0_db;
        c.gain = std::polar(0.3, 2.0);
        c.frequency = 4e-5;
        c.seed = 77;
        r = through(set, sent, c);
    }
    outcome through_aligner(aligner_options options = {}, std::vector<std::size_t> overflows = {}) const
    {
        aligner a(set, known, options);
        auto o = run(a, r, std::move(overflows));
        EXPECT_TRUE(o.lengths_hold);
        return o;
    }
};

/// Every judged symbol carries the index that was sent.
void expect_true_references(const outcome& o, const std::vector<std::uint16_t>& sent)
{
    std::size_t wrong = 0;
    for (std::size_t k = 0; k < sent.size(); ++k)
        wrong += o.reference[k] >= 0 && o.reference[k] != sent[k];
    EXPECT_EQ(wrong, 0u);
}

/// Nothing is excluded but what came before the first lock.
void expect_all_judged(const outcome& o)
{
    const auto lock = first_lock(o);
    EXPECT_LT(lock, 10000u);
    EXPECT_EQ(o.count(exclusion::before_lock), lock);
    EXPECT_EQ(o.judged(), o.out.size() - lock);
    EXPECT_EQ(o.status.state, lock_state::held);
    EXPECT_EQ(o.status.slips, 0u);
}

} // namespace

TEST(AlignFaults, CleanLinkIsJudgedToTheSymbol)
{
    for (const auto& k : kinds) {
        SCOPED_TRACE(k.set);
        const link_run l(k);
        const auto o = l.through_aligner();
        expect_all_judged(o);
        expect_true_references(o, l.sent);
    }
}

TEST(AlignFaults, BurstsAreJudgedInFull)
{
    // 200 symbols of strong noise: nearly all of them wrong, none excluded, and the link is the same
    // afterwards.
    for (const auto& k : kinds) {
        SCOPED_TRACE(k.set);
        link_run l(k);
        const double before = static_cast<double>(errors(l.set, l.through_aligner(), fault, count));
        std::vector<sample> noise(200);
        halfplane::kernels::complex_noise(3).draw(0, noise.size(), l.set.es() * 0.09 * 10, noise.data());
        std::copy(noise.begin(), noise.end(), l.r.begin() + fault);
        const auto o = l.through_aligner();
        expect_all_judged(o);
        expect_true_references(o, l.sent);
        const double chance = 200 * (1 - 1 / static_cast<double>(l.set.size()));
        const double in_burst = static_cast<double>(errors(l.set, o, fault, fault + 200));
        const double after = static_cast<double>(errors(l.set, o, fault + 200, count));
        EXPECT_NEAR(in_burst, chance, 5 * std::sqrt(200 * 0.25)); // five standard deviations
        EXPECT_NEAR(after, before, 5 * std::sqrt(before + 1) + 10);
        std::printf("%s: %g errors in the burst of 200, %g after it (%g without one)\n",
                    k.set,
                    in_burst,
                    after,
                    before);
    }
}

TEST(AlignFaults, ZeroedSamplesAreJudgedInFull)
{
    for (const auto& k : kinds) {
        SCOPED_TRACE(k.set);
        link_run l(k);
        std::fill_n(l.r.begin() + fault, 500, sample{});
        const auto o = l.through_aligner();
        expect_all_judged(o);
        expect_true_references(o, l.sent);
        for (std::size_t i = fault; i < fault + 500; ++i)
            ASSERT_EQ(o.out[i], sample{});
        bool doubted = false;
        for (const auto& e : o.events)
            doubted = doubted ||
                      (e.status.state == lock_state::doubtful && e.symbol <= fault && e.symbol + 300 > fault);
        EXPECT_TRUE(doubted);
    }
}

TEST(AlignFaults, SlipsAreNoticedAndOnlyTheSplitIsExcluded)
{
    for (const auto& k : kinds)
        for (int shift : {-40, -1, 1, 3, 60, 700}) { // symbols lost; negative: symbols of noise put in
            SCOPED_TRACE(std::string(k.set) + " " + std::to_string(shift));
            link_run l(k, count + 700);
            if (shift > 0) {
                l.r.erase(l.r.begin() + fault, l.r.begin() + fault + shift);
                l.sent.erase(l.sent.begin() + fault, l.sent.begin() + fault + shift);
            } else {
                std::vector<sample> noise(static_cast<std::size_t>(-shift));
                halfplane::kernels::complex_noise(3).draw(0, noise.size(), l.set.es() * 0.09, noise.data());
                l.r.insert(l.r.begin() + fault, noise.begin(), noise.end());
                l.sent.insert(l.sent.begin() + fault, noise.size(), 0);
            }
            l.r.resize(count);
            l.sent.resize(count);
            const auto o = l.through_aligner();
            const auto excluded = o.count(exclusion::slip);
            EXPECT_EQ(o.status.slips, 1u);
            EXPECT_EQ(o.count(exclusion::signal_lost), 0u);
            EXPECT_EQ(o.judged() + excluded + first_lock(o), count);
            EXPECT_LE(excluded, static_cast<std::size_t>(shift < 0 ? -shift : 0) + 60);
            // Wrong references are left at most next to the split, where old and new agree as well as not.
            std::size_t wrong = 0, held = 0;
            for (std::size_t i = 0; i < count; ++i)
                if (o.reference[i] >= 0 && o.reference[i] != l.sent[i]) {
                    ++wrong;
                    EXPECT_NEAR(static_cast<double>(i), fault, 60);
                }
            EXPECT_LE(wrong, 8u);
            for (const auto& e : o.events)
                if (e.status.state == lock_state::doubtful && e.symbol + 300 > fault)
                    held = held ? held : e.symbol;
            EXPECT_LE(held, fault + 2000);
            // The delay speaks of the first symbol ever put in, as if the new alignment had always held.
            const std::uint64_t period = l.known.period();
            EXPECT_EQ(o.status.delay,
                      (12345 + period * 2 + static_cast<std::uint64_t>(shift + 1000) - 1000) % period);
        }
}

TEST(AlignFaults, MutedInputIsLostAndFoundAgain)
{
    for (const auto& k : kinds) {
        SCOPED_TRACE(k.set);
        link_run l(k, 60000);
        std::fill_n(l.r.begin() + fault, 15000, sample{});
        const auto o = l.through_aligner();
        expect_true_references(o, l.sent);
        const auto lost = o.count(exclusion::signal_lost);
        EXPECT_GE(lost, 15000u);
        EXPECT_LT(lost, 15000u + 20000u);
        EXPECT_NEAR(static_cast<double>(
                        std::find(o.reference.begin(), o.reference.end(), code(exclusion::signal_lost)) -
                        o.reference.begin()),
                    fault,
                    8); // the end of the signal is found to a few symbols
        EXPECT_EQ(o.status.state, lock_state::held);
        EXPECT_EQ(o.status.slips, 0u);
        EXPECT_EQ(o.judged() + lost + first_lock(o), 60000u);
    }
}

TEST(AlignFaults, OverflowIsItsOwnCause)
{
    for (const auto& k : kinds) {
        SCOPED_TRACE(k.set);
        link_run l(k, count + 1234);
        l.r.erase(l.r.begin() + fault, l.r.begin() + fault + 1234);
        l.sent.erase(l.sent.begin() + fault, l.sent.begin() + fault + 1234);
        const auto o = l.through_aligner({}, {fault});
        expect_true_references(o, l.sent);
        EXPECT_EQ(o.status.state, lock_state::held);
        EXPECT_EQ(o.status.slips, 0u);
        EXPECT_EQ(o.count(exclusion::slip), 0u);
        EXPECT_EQ(o.count(exclusion::signal_lost), 0u);
        EXPECT_EQ(o.judged() + o.count(exclusion::overflow) + first_lock(o), count);
        for (std::size_t i = first_lock(o); i < fault; ++i)
            ASSERT_GE(o.reference[i], 0) << i;
    }
}

TEST(AlignFaults, BadSamplesPassWithTheirReferenceAndPoisonNothing)
{
    constexpr float nan = std::numeric_limits<float>::quiet_NaN(),
                    inf = std::numeric_limits<float>::infinity();
    for (const auto mode : {correction::running, correction::held, correction::off})
        for (const auto& k : kinds) {
            SCOPED_TRACE(k.set);
            link_run l(k);
            const double before = static_cast<double>(errors(l.set, l.through_aligner({mode}), fault, count));
            for (std::size_t i = 0; i < 30; ++i)
                l.r[fault + i] = {i % 2 ? nan : 0.1f, i % 3 ? inf : 0.2f};
            l.r[500] = {nan, nan}; // during the search
            l.r[fault + 5000] = {3e30f, 3e30f};
            const auto o = l.through_aligner({mode});
            expect_all_judged(o);
            expect_true_references(o, l.sent);
            for (std::size_t i = 0; i < 30; ++i) {
                const auto in = l.r[fault + i], out = o.out[fault + i];
                if (std::isfinite(in.real()) && std::isfinite(in.imag()))
                    continue;
                EXPECT_EQ(std::isnan(out.real()), std::isnan(in.real()));
                EXPECT_EQ(std::isinf(out.imag()), std::isinf(in.imag()));
            }
            const double after = static_cast<double>(errors(l.set, o, fault, count));
            EXPECT_NEAR(after, before, 5 * std::sqrt(before + 1) + 40);
        }
}

TEST(AlignFaults, StandingErrorsShowWhereCorrectionIsOff)
{
    // 8° and a gain of 0.7, on top of a quarter turn that is the set's own: only the quarter turn is undone.
    const auto set = halfplane::load_set("qam:16");
    const pattern known("o150:15", set);
    channel c;
    c.es_n0_db = 30;
    c.gain = std::polar(0.7, (90 + 8) * M_PI / 180);
    const auto sent = symbols(set, known, 5, count);
    const auto r = through(set, sent, c);
    aligner a(set, known, {correction::off});
    const auto o = run(a, r);
    EXPECT_EQ(o.status.rotation_deg, 90);
    complex g{};
    double energy = 0;
    for (std::size_t k = first_lock(o); k < count; ++k) {
        g += complex(o.out[k]) * std::conj(set.points()[sent[k]]);
        energy += std::norm(set.points()[sent[k]]);
    }
    g /= energy;
    EXPECT_NEAR(std::abs(g), 0.7, 1e-3);
    EXPECT_NEAR(std::arg(g) * 180 / M_PI, 8, 0.1);

    aligner b(set, known);
    const auto p = run(b, r);
    EXPECT_EQ(p.status.rotation_deg, 90);
    EXPECT_EQ(errors(set, p, first_lock(p), count), 0u);
}

TEST(AlignFaults, HeldStaysWhereItLocked)
{
    // A phase that creeps away after lock by 60° over the run: followed by the running estimate, shown by the
    // held one.
    const auto set = halfplane::load_set("psk:8");
    const pattern known("draw:1", set);
    channel c;
    c.es_n0_db = 25;
    const auto sent = symbols(set, known, 5, count);
    auto r = through(set, sent, c);
    for (std::size_t k = 10000; k < count; ++k)
        r[k] *= sample(std::polar(1.0, M_PI / 3 * static_cast<double>(k - 10000) / (count - 10000)));
    aligner held(set, known, {correction::held}), running(set, known);
    const auto h = run(held, r), g = run(running, r);
    EXPECT_EQ(errors(set, g, first_lock(g), count), 0u);
    EXPECT_EQ(errors(set, h, count - 5000, count), 5000u); // beyond 22.5° every symbol is wrong
    EXPECT_EQ(h.judged(), count - first_lock(h));
    EXPECT_EQ(h.status.slips, 0u);
    expect_true_references(h, sent);
}

TEST(AlignFaults, CorrectionIsCausal)
{
    // What comes out for a symbol does not change with what follows it.
    const link_run l(kinds[1]);
    const auto whole = l.through_aligner();
    aligner a(l.set, l.known);
    std::vector<sample> cut(l.r.begin(), l.r.begin() + 30000);
    const auto part = run(a, cut);
    std::size_t differ = 0;
    for (std::size_t k = 0; k < 30000; ++k)
        differ += part.out[k] != whole.out[k] || part.reference[k] != whole.reference[k];
    EXPECT_EQ(differ, 0u);
}

TEST(AlignFaults, RefusesAShortMemory)
{
    const auto set = halfplane::load_set("psk:4");
    try {
        aligner a(set, pattern("draw:1", set), {correction::running, 15});
        FAIL();
    } catch (const std::invalid_argument& e) {
        EXPECT_STREQ(e.what(), "aligner: memory must be at least 16 symbols, got 15");
    }
}
