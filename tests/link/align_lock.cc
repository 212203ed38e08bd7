// SPDX-License-Identifier: GPL-3.0-or-later
// align_lock: locks from anything it should lock to, says what it undid, and locks to nothing else.
#include "align_link.h"

#include <gtest/gtest.h>

#include <cstdio>
#include <cstdlib>

using namespace align_test;
using halfplane::code;
using halfplane::exclusion;
using halfplane::link::lock_state;

namespace {

signal_set named(const std::string& name)
{
    if (name == "firn-12")
        return firn12();
    if (name == "scattered-7")
        return scattered7();
    if (name == "on-off")
        return signal_set::with_natural_labels({{0, 0}, {1, 0}});
    return halfplane::load_set(name);
}

bool complement_is_a_turn(const signal_set& set)
{
    return set.size() <= 4;
}

std::vector<sample> noise(std::size_t count, std::uint64_t seed)
{
    std::vector<sample> r(count);
    halfplane::kernels::complex_noise(seed).draw(0, count, 1.0, r.data());
    return r;
}

} // namespace

TEST(AlignLock, LocksWithin20000SymbolsFromAnyGainPhaseFrequencyDelayMirrorAndPolarity)
{
    // Es/N0 where the bit error rate is near 0.1 (O.150) or the symbol error rate near 0.5 (draws), or
    // beyond; what it was is printed. A lock counts only with the right delay, mirror, polarity and every
    // reference right.
    struct {
        const char* set;
        const char* pattern;
        double es_n0_db;
    } const cases[] = {{"psk:2", "o150:9", -0.86},
                       {"psk:2", "o150:31", -0.86},
                       {"psk:4", "o150:29", 2.15},
                       {"psk:8", "o150:15", 5.5},
                       {"psk:8", "o150:23", 5.5},
                       {"qam:16", "o150:11", 6.6},
                       {"qam:16", "o150:31", 6.6},
                       {"qam:64", "o150:20", 9.6},
                       {"firn-12", "draw:1", 4.0},
                       {"scattered-7", "draw:9:5000", 0.5},
                       {"qam:16", "draw:5:60000", 5.5},
                       {"psk:8", "draw:3", 2.5}};
    constexpr int tries = 100;
    for (const auto& c : cases) {
        SCOPED_TRACE(std::string(c.set) + " " + c.pattern);
        const auto set = named(c.set);
        const pattern known(c.pattern, set);
        int locked = 0;
        double error_rate = 0, bit_error_rate = 0, latest = 0;
        for (int t = 0; t < tries; ++t) {
            const try_of q(static_cast<std::uint64_t>(1000 + t),
                           c.es_n0_db,
                           known,
                           set.size() > 2,
                           known.carries_bits() && !complement_is_a_turn(set));
            const auto sent = symbols(set, known, q.start, 24000, q.c.inverted);
            const auto r = through(set, sent, q.c);
            aligner a(set, known);
            const auto o = run(a, r);
            const auto lock = first_lock(o);
            bool right = lock <= 20000 && o.status.mirrored == q.c.mirrored &&
                         o.status.inverted == q.c.inverted && o.status.delay == q.start &&
                         o.status.slips == 0;
            for (std::size_t k = lock; right && k < r.size(); ++k)
                right = o.reference[k] < 0 || o.reference[k] == sent[k];
            if (!right)
                continue;
            ++locked;
            EXPECT_NEAR(o.status.frequency, q.c.mirrored ? -q.c.frequency : q.c.frequency, 2e-5);
            latest = std::max(latest, static_cast<double>(lock));
            const double judged = static_cast<double>(o.judged());
            error_rate += static_cast<double>(errors(set, o, lock, r.size())) / judged;
            std::vector<std::uint16_t> decided(r.size() - lock);
            halfplane::kernels::point_decider(set).decide(&o.out[lock], decided.data(), decided.size());
            for (std::size_t k = lock; k < r.size(); ++k)
                if (o.reference[k] >= 0)
                    bit_error_rate +=
                        halfplane::label_distance(set.labels()[decided[k - lock]], set.labels()[sent[k]]) /
                        judged / set.label_bits();
        }
        std::printf("%-12s %-13s %5.2f dB: %d of %d, latest at %5.0f; SER %.3f, BER %.3f\n",
                    c.set,
                    c.pattern,
                    c.es_n0_db,
                    locked,
                    tries,
                    latest,
                    error_rate / locked,
                    bit_error_rate / locked);
        EXPECT_GE(locked, 99);
    }
}

TEST(AlignLock, SaysWhichRotationAndMirrorItUndid)
{
    for (const char* name :
         {"psk:2", "psk:4", "psk:8", "qam:16", "firn-12", "hex:7", "scattered-7", "cross:32"}) {
        const auto set = named(name);
        const int rotations = std::string(name) == "psk:2"         ? 2
                              : std::string(name) == "psk:8"       ? 8
                              : std::string(name) == "hex:7"       ? 6
                              : std::string(name) == "scattered-7" ? 1
                                                                   : 4;
        for (const std::string text : {"draw:4", "o150:23"}) {
            if (text == "o150:23" && set.size() != std::size_t{1} << set.label_bits())
                continue;
            const pattern known(text, set);
            for (int turn = 0; turn < rotations; ++turn)
                for (bool mirrored : {false, true}) {
                    if (mirrored && set.size() == 2)
                        continue; // the same as none
                    SCOPED_TRACE(std::string(name) + " " + text + " turn " + std::to_string(turn) +
                                 (mirrored ? " mirrored" : ""));
                    channel c;
                    c.es_n0_db = 25;
                    // Half a step off the symmetry would be ambiguous; a seventh of one is not.
                    c.gain = std::polar(2.0, 2 * M_PI * (turn + 1.0 / 7) / rotations);
                    c.mirrored = mirrored;
                    const auto sent = symbols(set, known, 99, 12000);
                    aligner a(set, known);
                    const auto o = run(a, through(set, sent, c));
                    ASSERT_EQ(o.status.state, lock_state::held);
                    EXPECT_NEAR(o.status.rotation_deg, 360.0 * turn / rotations, 1e-9);
                    EXPECT_EQ(o.status.mirrored, mirrored);
                    EXPECT_FALSE(o.status.inverted);
                    EXPECT_EQ(o.status.delay, 99u);
                }
        }
    }
}

TEST(AlignLock, HalfATurnIsReportedRatherThanAnInversion)
{
    for (const char* name : {"psk:2", "psk:4"}) {
        const auto set = named(name);
        for (const char* text : {"o150:9", "o150:31"}) {
            const pattern known(text, set);
            channel c;
            const auto sent = symbols(set, known, 7, 12000, true);
            aligner a(set, known);
            const auto o = run(a, through(set, sent, c));
            ASSERT_EQ(o.status.state, lock_state::held);
            EXPECT_FALSE(o.status.inverted);
            EXPECT_EQ(o.status.rotation_deg, 180);
            EXPECT_EQ(o.status.delay, 7u);
        }
    }
}

TEST(AlignLock, BitsMayBeginASymbolAnywhereInAShiftRegister)
{
    // 2^9 − 1 = 7·73: with labels of seven bits only every seventh bit begins a symbol of the pattern as a
    // table has it, but a transmitter may have started elsewhere.
    const auto set = named("cross:128");
    const pattern known("o150:9", set), bits("o150:9", named("psk:2"));
    for (std::uint64_t first : {0u, 1u, 5u, 300u}) {
        std::vector<std::uint16_t> stream(7 * 12000), sent(12000);
        bits.indices(first, stream.size(), stream.data());
        for (std::size_t k = 0; k < sent.size(); ++k) {
            unsigned label = 0;
            for (unsigned b = 0; b < 7; ++b)
                label = label << 1 | named("psk:2").labels()[stream[7 * k + b]];
            sent[k] = static_cast<std::uint16_t>(set.index_of_label(label));
        }
        channel c;
        c.es_n0_db = 28;
        aligner a(set, known);
        const auto o = run(a, through(set, sent, c));
        ASSERT_LT(first_lock(o), 12000u) << first;
        for (std::size_t k = first_lock(o); k < sent.size(); ++k)
            ASSERT_EQ(o.reference[k], sent[k]) << first;
    }
}

TEST(AlignLock, LargestSets)
{
    struct {
        const char* set;
        const char* pattern;
        double es_n0_db;
    } const cases[] = {{"qam:4096", "draw:1", 45}, {"qam:4096", "o150:31", 45}};
    for (const auto& q : cases) {
        const auto set = named(q.set);
        const pattern known(q.pattern, set);
        channel c;
        c.es_n0_db = q.es_n0_db;
        c.gain = std::polar(5.0, 1.0);
        c.frequency = -7e-5;
        const auto sent = symbols(set, known, 321, 24000);
        aligner a(set, known);
        const auto o = run(a, through(set, sent, c));
        const auto lock = first_lock(o);
        std::printf("%s, %s: locked at %llu\n", q.set, q.pattern, static_cast<unsigned long long>(lock));
        EXPECT_LE(lock, 20000u);
        for (std::size_t k = lock; k < sent.size(); ++k)
            ASSERT_EQ(o.reference[k], sent[k]);
    }
}

TEST(AlignLock, DegenerateInputIsRefused)
{
    constexpr std::size_t count = 40000;
    for (const char* name : {"psk:2", "psk:8", "firn-12", "on-off"}) {
        const auto set = named(name);
        for (const std::string text :
             {"o150:9", "o150:15", "o150:23", "o150:31", "draw:1", "draw:2:100000"}) {
            if (text[0] == 'o' && set.size() != std::size_t{1} << set.label_bits())
                continue;
            const pattern known(text, set);
            const auto refuses = [&](const std::vector<sample>& r, const char* what) {
                aligner a(set, known);
                const auto o = run(a, r);
                EXPECT_EQ(o.judged(), 0u) << name << ", " << text << ": " << what;
                EXPECT_EQ(o.count(exclusion::before_lock), r.size()) << name << ", " << text << ": " << what;
                EXPECT_TRUE(o.events.empty());
            };
            const auto weak = noise(count, 5);
            std::vector<sample> r(count);
            refuses(r, "zeros");
            for (std::size_t k = 0; k < count; ++k)
                r[k] = weak[k] * 1e-3f;
            refuses(r, "muted");
            r.assign(count, {0.6f, -0.4f});
            refuses(r, "a constant");
            for (double f : {0.0, 1e-4, 0.03}) {
                for (std::size_t k = 0; k < count; ++k)
                    r[k] =
                        sample(std::polar(1.0, 1 + 2 * M_PI * f * static_cast<double>(k))) + weak[k] * 0.1f;
                refuses(r, "an unmodulated carrier");
            }
            // Idle codes: few symbols over and over.
            for (std::size_t length : {2u, 3u, 16u}) {
                for (std::size_t k = 0; k < count; ++k)
                    r[k] = sample(set.points()[k % length * 5 % set.size()]) + weak[k] * 0.1f;
                refuses(r, "an idle code");
            }
            std::vector<std::string> others = {"draw:3", "draw:4:100000"};
            if (set.size() == std::size_t{1} << set.label_bits())
                for (const char* other :
                     {"o150:9", "o150:11", "o150:15", "o150:20", "o150:23", "o150:29", "o150:31"})
                    others.emplace_back(other);
            channel c;
            c.es_n0_db = 25;
            for (const auto& other : others)
                if (other != text)
                    refuses(through(set, symbols(set, pattern(other, set), 0, count), c),
                            ("the pattern " + other).c_str());
        }
    }
}

/// Ten million symbols in the ordinary suite; HALFPLANE_NOISE_SYMBOLS=1e8 runs as many.
TEST(AlignLock, NoiseNeverLocks)
{
    const char* wanted = std::getenv("HALFPLANE_NOISE_SYMBOLS");
    const double symbols_in_all = wanted ? std::atof(wanted) : 1e7;
    ASSERT_GE(symbols_in_all, 1e6) << "HALFPLANE_NOISE_SYMBOLS is '" << wanted << "'";
    struct {
        const char* set;
        const char* pattern;
        double share;
    } const cases[] = {{"psk:2", "o150:31", 0.2},
                       {"qam:16", "o150:23", 0.3},
                       {"psk:4", "draw:1", 0.3},
                       {"psk:8", "o150:15", 0.2}};
    for (const auto& c : cases) {
        const auto set = named(c.set);
        const pattern known(c.pattern, set);
        aligner a(set, known);
        std::vector<sample> r(100000), out(r.size());
        std::vector<halfplane::reference_t> reference(r.size());
        const halfplane::kernels::complex_noise source(11);
        for (std::size_t k = 0; k < static_cast<std::size_t>(c.share * symbols_in_all / 1e5); ++k) {
            source.draw(k * r.size(), r.size(), 1.0, r.data());
            const auto n = a.process(r.data(), r.size(), out.data(), reference.data());
            for (std::size_t i = 0; i < n; ++i)
                ASSERT_EQ(reference[i], code(exclusion::before_lock));
        }
        EXPECT_EQ(a.status().state, lock_state::searching);
        EXPECT_TRUE(a.take_events().empty()) << c.set << " " << c.pattern;
    }
}
