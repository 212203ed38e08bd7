// SPDX-License-Identifier: GPL-3.0-or-later
// standard_sets: what each document implies for its constellations: energy, symmetry, Gray labels, single
// points.
//
// Formulas, figures and single values here are from memory of the documents, like the sets themselves; the
// checks are those that a slip in a sign, a bit order or a radius does not pass.
#include "halfplane/geometry.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <string>

using namespace halfplane;

namespace {

const double pi = std::acos(-1.0);

/// The point of a label written as bits.
complex at(const signal_set& set, const std::string& bits)
{
    const int index = set.index_of_label(static_cast<unsigned>(std::stoul(bits, nullptr, 2)));
    return set.points().at(static_cast<std::size_t>(index));
}

void expect_point(const std::string& name,
                  const std::string& bits,
                  complex expected,
                  double tolerance = 1e-14)
{
    EXPECT_NEAR(std::abs(at(named_set(name), bits) - expected), 0, tolerance) << name << ' ' << bits;
}

bool starts_with(const std::string& text, const std::string& start)
{
    return text.rfind(start, 0) == 0;
}

} // namespace

TEST(StandardSets, UnitEnergyNoMeanAllLabelsInOrder)
{
    std::size_t checked = 0;
    for (const auto& entry : named_sets()) {
        if (!starts_with(entry.name, "std:"))
            continue;
        const auto set = named_set(entry.name);
        EXPECT_NEAR(set.es(), 1, 1e-14) << entry.name;
        EXPECT_NEAR(std::abs(set.mean()), 0, 1e-14) << entry.name;
        EXPECT_EQ(set.size(), std::size_t{1} << set.label_bits()) << entry.name;
        for (std::size_t k = 0; k < set.size(); ++k)
            EXPECT_EQ(set.labels()[k], k) << entry.name; // index = label
        EXPECT_NE(entry.source.find("from memory"), std::string::npos) << entry.name;
        EXPECT_NE(entry.source.find("§"), std::string::npos) << entry.name;
        ++checked;
    }
    EXPECT_GE(checked, 28u);
}

TEST(StandardSets, GrayAndSquareWhereTheDocumentHasIt)
{
    for (const char* document : {"std:38.211/", "std:802.11/", "std:302755/rotated-"})
        for (const char* kind : {"qpsk", "16qam", "64qam", "256qam"}) {
            const auto facts = inspect(named_set(std::string(document) + kind));
            EXPECT_TRUE(facts.gray) << facts.name;
            EXPECT_EQ(facts.rotations, 4u) << facts.name;
            EXPECT_EQ(facts.mirrors, 4u) << facts.name;
            const double side = std::sqrt(static_cast<double>(facts.size));
            EXPECT_EQ(facts.closest_pairs, static_cast<std::uint64_t>(4 * side * (side - 1))) << facts.name;
            EXPECT_NEAR(facts.d_min, 2 / std::sqrt(2.0 * (side * side - 1) / 3), 1e-14) << facts.name;
        }
    EXPECT_TRUE(inspect(named_set("std:38.211/1024qam")).gray);
    EXPECT_TRUE(inspect(named_set("std:802.11/1024qam")).gray);
    EXPECT_TRUE(inspect(named_set("std:302307-1/qpsk")).gray);
    EXPECT_TRUE(inspect(named_set("std:302307-1/8psk")).gray);
}

TEST(StandardSets, Ts38211FormulasWrittenOut)
{
    // §5.1.4: d = 1/√10 · {(1 − 2b0)[2 − (1 − 2b2)] + j(1 − 2b1)[2 − (1 − 2b3)]}
    const auto s16 = named_set("std:38.211/16qam");
    for (unsigned l = 0; l < 16; ++l) {
        const double b0 = l >> 3 & 1, b1 = l >> 2 & 1, b2 = l >> 1 & 1, b3 = l & 1;
        const complex d((1 - 2 * b0) * (2 - (1 - 2 * b2)), (1 - 2 * b1) * (2 - (1 - 2 * b3)));
        EXPECT_NEAR(std::abs(s16.points()[l] - d / std::sqrt(10.0)), 0, 1e-15);
    }
    // §5.1.5: d = 1/√42 · {(1 − 2b0)[4 − (1 − 2b2)[2 − (1 − 2b4)]] + j(1 − 2b1)[4 − (1 − 2b3)[2 − (1 −
    // 2b5)]]}
    const auto s64 = named_set("std:38.211/64qam");
    for (unsigned l = 0; l < 64; ++l) {
        const auto b = [&](unsigned k) { return 1 - 2.0 * (l >> (5 - k) & 1); };
        const complex d(b(0) * (4 - b(2) * (2 - b(4))), b(1) * (4 - b(3) * (2 - b(5))));
        EXPECT_NEAR(std::abs(s64.points()[l] - d / std::sqrt(42.0)), 0, 1e-15);
    }
    // §5.1.6: factor 1/√170 and 8, 4, 2
    const auto s256 = named_set("std:38.211/256qam");
    for (unsigned l = 0; l < 256; ++l) {
        const auto b = [&](unsigned k) { return 1 - 2.0 * (l >> (7 - k) & 1); };
        const complex d(b(0) * (8 - b(2) * (4 - b(4) * (2 - b(6)))),
                        b(1) * (8 - b(3) * (4 - b(5) * (2 - b(7)))));
        EXPECT_NEAR(std::abs(s256.points()[l] - d / std::sqrt(170.0)), 0, 1e-15);
    }
    expect_point("std:38.211/bpsk", "0", std::polar(1.0, pi / 4));
    expect_point("std:38.211/bpsk", "1", std::polar(1.0, -3 * pi / 4));
    expect_point("std:38.211/qpsk", "10", complex(-1, 1) / std::sqrt(2.0));
}

TEST(StandardSets, Wlan80211TableOfLevels)
{
    // §17.3.5.8, 16-QAM: b0b1 = 00, 01, 11, 10 give I = −3, −1, 1, 3; 64-QAM: 000, 001, 011, 010, 110, 111,
    // 101, 100 give −7 … 7.
    const char* two[] = {"00", "01", "11", "10"};
    for (int i = 0; i < 4; ++i)
        for (int q = 0; q < 4; ++q)
            expect_point("std:802.11/16qam",
                         std::string(two[i]) + two[q],
                         complex(2 * i - 3, 2 * q - 3) / std::sqrt(10.0));
    const char* three[] = {"000", "001", "011", "010", "110", "111", "101", "100"};
    for (int i = 0; i < 8; ++i)
        for (int q = 0; q < 8; ++q)
            expect_point("std:802.11/64qam",
                         std::string(three[i]) + three[q],
                         complex(2 * i - 7, 2 * q - 7) / std::sqrt(42.0));
    expect_point("std:802.11/bpsk", "0", {-1, 0});
    expect_point("std:802.11/bpsk", "1", {1, 0});
    expect_point("std:802.11/qpsk", "10", complex(1, -1) / std::sqrt(2.0));
}

TEST(StandardSets, Apsk302307RadiiAnglesAndLabels)
{
    struct rate16 {
        const char* name;
        double gamma;
    };
    for (const auto& r :
         {rate16{"2-3", 3.15}, {"3-4", 2.85}, {"4-5", 2.75}, {"5-6", 2.70}, {"8-9", 2.60}, {"9-10", 2.57}}) {
        const std::string name = std::string("std:302307-1/16apsk/") + r.name;
        const auto set = named_set(name);
        const double inner = std::abs(at(set, "1100")), outer = std::abs(at(set, "0000"));
        EXPECT_NEAR(outer / inner, r.gamma, 1e-14) << name;
        EXPECT_NEAR(inner * inner + 3 * outer * outer, 4, 1e-14) << name;
        expect_point(name, "0000", std::polar(outer, pi / 4));
        expect_point(name, "0100", std::polar(outer, pi / 12));
        expect_point(name, "1110", std::polar(inner, 3 * pi / 4));
        // The same points as the family with half-step phases, turned by nothing.
        const auto family = named_set("apsk:4+12:" + std::to_string(r.gamma));
        for (const auto& p : family.points()) {
            double nearest = 1;
            for (const auto& s : set.points())
                nearest = std::min(nearest, std::abs(s - p * inner));
            EXPECT_LT(nearest, 1e-14) << name;
        }
        EXPECT_EQ(count_symmetries(set).rotations, 4u);
        EXPECT_EQ(count_symmetries(set).mirrors, 4u);
    }
    struct rate32 {
        const char* name;
        double gamma1, gamma2;
    };
    for (const auto& r : {rate32{"3-4", 2.84, 5.27},
                          {"4-5", 2.72, 4.87},
                          {"5-6", 2.64, 4.64},
                          {"8-9", 2.54, 4.33},
                          {"9-10", 2.53, 4.30}}) {
        const std::string name = std::string("std:302307-1/32apsk/") + r.name;
        const auto set = named_set(name);
        const double r1 = std::abs(at(set, "10001")), r2 = std::abs(at(set, "00000")),
                     r3 = std::abs(at(set, "11000"));
        EXPECT_NEAR(r2 / r1, r.gamma1, 1e-14) << name;
        EXPECT_NEAR(r3 / r1, r.gamma2, 1e-14) << name;
        EXPECT_NEAR(r1 * r1 + 3 * r2 * r2 + 4 * r3 * r3, 8, 1e-13) << name;
        std::size_t on[3] = {};
        for (const auto& p : set.points())
            for (int ring = 0; ring < 3; ++ring)
                on[ring] += std::abs(std::abs(p) - (ring == 0 ? r1 : ring == 1 ? r2 : r3)) < 1e-12;
        EXPECT_EQ(on[0], 4u);
        EXPECT_EQ(on[1], 12u);
        EXPECT_EQ(on[2], 16u);
        EXPECT_EQ(count_symmetries(set).rotations, 4u);
        EXPECT_EQ(count_symmetries(set).mirrors, 4u);
    }
}

TEST(StandardSets, Apsk302307RingsAreGrayAlongTheirCircles)
{
    // Neighbours on the 12-point ring of 16APSK and on the rings of 4 differ in one bit; every mirror about
    // an axis flips one and the same bit of all labels, which ties the four quadrants of both figures
    // together.
    for (const char* name : {"std:302307-1/16apsk/3-4", "std:302307-1/32apsk/3-4"}) {
        const auto set = named_set(name);
        for (bool about_real : {true, false}) {
            unsigned flipped = 0;
            for (std::size_t a = 0; a < set.size(); ++a) {
                const complex p = set.points()[a], image = about_real ? std::conj(p) : -std::conj(p);
                for (std::size_t b = 0; b < set.size(); ++b)
                    if (a != b && std::abs(set.points()[b] - image) < 1e-12)
                        flipped |= 1u << (set.labels()[a] ^ set.labels()[b]) % 32;
            }
            // one label difference, a single bit, for all points off the axis
            if (std::string(name).find("16apsk") != std::string::npos) {
                EXPECT_TRUE(flipped == 1u << 1 || flipped == 1u << 2 || flipped == 1u << 4 ||
                            flipped == 1u << 8)
                    << flipped;
            }
        }
    }
    const auto set = named_set("std:302307-1/16apsk/3-4");
    const double outer = std::abs(at(set, "0000")), inner = std::abs(at(set, "1100"));
    const auto label_near = [&](complex z) {
        for (std::size_t k = 0; k < set.size(); ++k)
            if (std::abs(set.points()[k] - z) < 1e-9)
                return set.labels()[k];
        throw std::logic_error("no point");
    };
    for (int k = 0; k < 12; ++k)
        EXPECT_EQ(label_distance(label_near(std::polar(outer, (2 * k + 1) * pi / 12)),
                                 label_near(std::polar(outer, (2 * k + 3) * pi / 12))),
                  1u);
    for (int k = 0; k < 4; ++k)
        EXPECT_EQ(label_distance(label_near(std::polar(inner, (2 * k + 1) * pi / 4)),
                                 label_near(std::polar(inner, (2 * k + 3) * pi / 4))),
                  1u);
}

TEST(StandardSets, Rotated302755AnglesAndLevels)
{
    // Turned back by the angle of the document, 256-QAM lies on odd levels; 0000 is +15, 1000 is −15 on I.
    struct row {
        const char* name;
        double degrees, scale;
        std::string zero;
        complex zero_at, one_at; ///< of label 00…0 and 10…0
    };
    for (const auto& r :
         {row{"qpsk", 29.0, std::sqrt(2.0), "0", {1, 1}, {-1, 1}},
          row{"16qam", 16.8, std::sqrt(10.0), "000", {3, 3}, {-3, 3}},
          row{"64qam", 8.6, std::sqrt(42.0), "00000", {7, 7}, {-7, 7}},
          row{"256qam", std::atan(1 / 16.0) * 180 / pi, std::sqrt(170.0), "0000000", {15, 15}, {-15, 15}}}) {
        const complex turn = std::polar(1 / r.scale, r.degrees * pi / 180);
        const std::string name = std::string("std:302755/rotated-") + r.name;
        expect_point(name, "0" + r.zero, r.zero_at * turn);
        expect_point(name, "1" + r.zero, r.one_at * turn);
        // The point of the rotation: every point has a value of its own on either axis.
        const auto set = named_set(name);
        double least = 1;
        for (std::size_t a = 0; a < set.size(); ++a)
            for (std::size_t b = 0; b < a; ++b)
                least = std::min({least,
                                  std::abs(set.points()[a].real() - set.points()[b].real()),
                                  std::abs(set.points()[a].imag() - set.points()[b].imag())});
        EXPECT_GT(least, 1e-3) << name;
    }
}
