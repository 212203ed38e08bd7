// SPDX-License-Identifier: GPL-3.0-or-later
// named_set: names are frozen by tables/named_sets.txt; what each family promises; every refusal.
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdint>
#include <cstdio>
#include <fstream>
#include <sstream>
#include <string>
#include <vector>

using namespace halfplane;

namespace {

std::string refusal(const std::string& name)
{
    try {
        named_set(name);
    } catch (const invalid_set& e) {
        return e.what();
    }
    return "accepted";
}

/// Coordinates in units of 1e-9, so that the last bit of a cosine does not matter.
long long rounded(double x)
{
    return std::llround(x * 1e9);
}

std::string listing(const signal_set& set)
{
    std::ostringstream out;
    for (std::size_t k = 0; k < set.size(); ++k)
        out << "  " << set.label_string(k) << ' ' << rounded(set.points()[k].real()) << ' '
            << rounded(set.points()[k].imag()) << '\n';
    return out.str();
}

/// FNV-1a, 64 bits.
std::string digest(const std::string& text)
{
    std::uint64_t hash = 0xcbf29ce484222325u;
    for (unsigned char c : text)
        hash = (hash ^ c) * 0x100000001b3u;
    char shown[17];
    std::snprintf(shown, sizeof shown, "%016llx", static_cast<unsigned long long>(hash));
    return shown;
}

std::string frozen_form(const std::string& name)
{
    const auto set = named_set(name);
    const auto points = listing(set);
    return name + ' ' + std::to_string(set.size()) + ' ' + digest(points) + '\n' +
           (set.size() <= 32 ? points : std::string());
}

std::vector<std::string> frozen_names()
{
    std::vector<std::string> names;
    for (int m : {2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 16, 24, 32, 33, 64, 100, 128, 256, 1024, 4096})
        names.push_back("psk:" + std::to_string(m));
    for (int m = 2; m <= 4096; m *= 2)
        names.push_back("qam:" + std::to_string(m));
    for (int m : {32, 128, 512, 2048})
        names.push_back("cross:" + std::to_string(m));
    for (int m :
         {2, 3, 4, 5, 6, 7, 8, 9, 10, 12, 13, 16, 19, 31, 32, 37, 61, 64, 91, 127, 128, 256, 1024, 4096})
        names.push_back("hex:" + std::to_string(m));
    for (const char* name : {"star:4+4",
                             "star:2+2",
                             "star:4+4:3",
                             "star:8+8",
                             "star:8+8:2.5",
                             "star:8+8+8+8",
                             "apsk:8",
                             "apsk:1+7",
                             "apsk:4+8:2.3",
                             "apsk:4+12:2.85",
                             "apsk:1+5+10:1.9",
                             "apsk:4+12+16:2.84,5.27",
                             "apsk:16+16+16+16:2,3,4"})
        names.push_back(name);
    for (const auto& entry : named_sets())
        if (entry.name.rfind("std:", 0) == 0)
            names.push_back(entry.name);
    return names;
}

unsigned neighbour_bits(const signal_set& set)
{
    unsigned sum = 0;
    for (std::size_t k = 0; k < set.size(); ++k)
        sum += label_distance(set.labels()[k], set.labels()[(k + 1) % set.size()]);
    return sum;
}

} // namespace

// The table is the promise to users. Where it must grow, this test writes what it found beside its program.
TEST(NamedSet, PointsOrderAndLabelsAreFrozen)
{
    std::ifstream file(HALFPLANE_TEST_DIR "/tables/named_sets.txt");
    std::stringstream frozen;
    frozen << file.rdbuf();
    std::string actual;
    for (const auto& name : frozen_names())
        actual += frozen_form(name);
    if (frozen.str() != actual) {
        std::ofstream("named_sets.found.txt") << actual;
        std::istringstream a(frozen.str()), b(actual);
        std::string was, is;
        while (std::getline(b, is) && std::getline(a, was) && is == was) {
        }
        FAIL() << "frozen: " << was << "\nfound:  " << is
               << "\nall that was found stands in named_sets.found.txt";
    }
}

TEST(NamedSet, PskStandsOnTheUnitCircleAndIsGrayWhereThatIsPossible)
// The reference angle is itself rounded: 2e-15 is about 2π·ε.
{
    for (std::size_t m = 2; m <= 4096; m = m < 70 ? m + 1 : 2 * m - 3) {
        const auto set = named_set("psk:" + std::to_string(m));
        for (std::size_t k = 0; k < m; ++k)
            ASSERT_NEAR(
                std::abs(set.points()[k] - std::polar(1.0, 2 * std::acos(-1.0) * double(k) / double(m))),
                0,
                2e-15);
        // A closed walk flips every bit an even number of times: m even can do with m flips, m odd needs m
        // + 1.
        ASSERT_EQ(neighbour_bits(set), m + m % 2) << m;
    }
}

TEST(NamedSet, QamIsAGrayGridOnOddIntegers)
{
    for (std::size_t m = 2; m <= 4096; m *= 2) {
        const auto set = named_set("qam:" + std::to_string(m));
        std::size_t close = 0;
        double right = 0, top = 0;
        for (std::size_t a = 0; a < m; ++a) {
            right = std::max(right, set.points()[a].real());
            top = std::max(top, set.points()[a].imag());
            for (std::size_t b = a + 1; b < m && b <= a + 64; ++b)
                if (std::norm(set.points()[a] - set.points()[b]) == 4) {
                    ++close;
                    ASSERT_EQ(label_distance(set.labels()[a], set.labels()[b]), 1u) << m;
                }
        }
        const auto columns = static_cast<std::size_t>(right) + 1, rows = m / columns;
        EXPECT_EQ(top, static_cast<double>(rows - 1));
        EXPECT_EQ(close, rows * (columns - 1) + columns * (rows - 1));
        EXPECT_EQ(set.mean(), complex(0, 0));
        EXPECT_EQ(set.points().front(), complex(1.0 - double(columns), 1.0 - double(rows)));
    }
    // 2(M − 1)/3 for squares (Proakis, Digital Communications, ch. 3, from memory).
    EXPECT_DOUBLE_EQ(named_set("qam:64").es(), 42);
}

TEST(NamedSet, CrossHasTheEnergyOfTheTextbooks)
{
    // Mean energy of cross sets of odd integers, (31·M/32 − 1)·2/3 (J. G. Smith 1975, from memory): 20, 82,
    // 330, 1322.
    for (double m : {32, 128, 512, 2048})
        EXPECT_DOUBLE_EQ(named_set("cross:" + std::to_string(int(m))).es(), (31 * m / 32 - 1) * 2 / 3);
}

TEST(NamedSet, HexIsTheLatticeWithTheLeastEnergyAndNoMean)
{
    for (int m : {2, 3, 7, 12, 19, 32, 37, 61, 64, 127, 1024}) {
        const auto set = named_set("hex:" + std::to_string(m));
        EXPECT_NEAR(set.d_min(), 2, 1e-12) << m;
        EXPECT_NEAR(std::abs(set.mean()), 0, 1e-12) << m;
    }
    // By hand, d_min 2: a pair at ±1; a triangle of circumradius 2/√3; shells of 6 at 2, 6 at √12 and 6 at 4.
    EXPECT_DOUBLE_EQ(named_set("hex:2").es(), 1);
    EXPECT_NEAR(named_set("hex:3").es(), 4.0 / 3, 1e-15);
    EXPECT_NEAR(named_set("hex:7").es(), 24.0 / 7, 1e-14);
    EXPECT_NEAR(named_set("hex:19").es(), (6 * 4 + 6 * 12 + 6 * 16) / 19.0, 1e-13);
}

TEST(NamedSet, RingsHaveTheirRadii)
{
    const auto star = named_set("star:4+4");
    EXPECT_EQ(star.points()[0], complex(1, 0));
    EXPECT_EQ(star.points()[5], complex(0, 2));
    EXPECT_EQ(named_set("star:4+4:3").points()[5], complex(0, 3));
    const auto apsk = named_set("apsk:4+12+16:2.84,5.27");
    EXPECT_NEAR(std::abs(apsk.points()[0]), 1, 1e-15);
    EXPECT_NEAR(std::abs(apsk.points()[4]), 2.84, 1e-15);
    EXPECT_NEAR(std::arg(apsk.points()[4]), std::acos(-1.0) / 12, 1e-15);
    EXPECT_NEAR(std::abs(apsk.points()[31]), 5.27, 1e-15);
    const auto centred = named_set("apsk:1+7");
    EXPECT_EQ(centred.points()[0], complex(0, 0));
    EXPECT_NEAR(std::abs(centred.points()[1]), 1, 1e-15);
    // The demonstration set is apsk:4+8:2.3 under a name of its own.
    const auto firn = load_set(HALFPLANE_SOURCE_DIR "/examples/sets/firn-12.json"),
               same = named_set("apsk:4+8:2.3");
    for (std::size_t k = 0; k < 12; ++k)
        EXPECT_NEAR(std::abs(firn.points()[k] - same.points()[k]), 0, 1e-14);
}

TEST(NamedSet, EveryListedNameLoadsUnderItsName)
{
    EXPECT_GE(named_sets().size(), 30u);
    for (const auto& entry : named_sets()) {
        EXPECT_EQ(named_set(entry.name).name(), entry.name);
        EXPECT_FALSE(entry.about.empty());
        EXPECT_FALSE(entry.source.empty());
    }
}

TEST(NamedSet, Refusals)
{
    EXPECT_EQ(refusal("psk:1"), "\"psk:1\": the size must be 2 to 4096, got 1");
    EXPECT_EQ(refusal("psk:4097"), "\"psk:4097\": the size must be 1 to 4096, got \"4097\"");
    EXPECT_EQ(refusal("psk:"), "\"psk:\": the size must be 1 to 4096, got \"\"");
    EXPECT_EQ(refusal("psk:8.5"), "\"psk:8.5\": the size must be a whole number up to 4096, got \"8.5\"");
    EXPECT_EQ(refusal("psk:-8"), "\"psk:-8\": the size must be a whole number up to 4096, got \"-8\"");
    EXPECT_EQ(refusal("psk:99999999999999999999999"),
              "\"psk:99999999999999999999999\": the size must be a whole number up to 4096, got "
              "\"99999999999999999999999\"");
    EXPECT_EQ(refusal("qam:12"), "\"qam:12\": qam takes a power of two from 2 to 4096, got 12");
    EXPECT_EQ(refusal("qam:16:2"), "\"qam:16:2\": too many colons, expected something like qam:16");
    EXPECT_EQ(refusal("cross:64"), "\"cross:64\": cross takes 32, 128, 512 or 2048, got 64");
    EXPECT_EQ(refusal("star:4+8"),
              "\"star:4+8\": star has as many points on every ring (apsk takes any), got 4+8");
    EXPECT_EQ(refusal("star:1+1"), "\"star:1+1\": star needs at least 2 points a ring, got 1+1");
    EXPECT_EQ(refusal("star:4+"), "\"star:4+\": the points of a ring must be 1 to 4096, got \"\"");
    EXPECT_EQ(refusal("apsk:4+12"),
              "\"apsk:4+12\": 2 rings about 0 need 1 radius ratios to the innermost, got 0");
    EXPECT_EQ(refusal("apsk:4+12:2,3"),
              "\"apsk:4+12:2,3\": 2 rings about 0 need 1 radius ratios to the innermost, got 2");
    EXPECT_EQ(refusal("apsk:4+12:0.5"),
              "\"apsk:4+12:0.5\": radius ratio 1 must be a number above 1, got \"0.5\"");
    EXPECT_EQ(refusal("apsk:4+12+16:3,2"),
              "\"apsk:4+12+16:3,2\": radius ratio 2 must be a number above 3, got \"2\"");
    EXPECT_EQ(refusal("apsk:4+12:nan"),
              "\"apsk:4+12:nan\": radius ratio 1 must be a number above 1, got \"nan\"");
    EXPECT_EQ(refusal("apsk:1"), "\"apsk:1\": the size must be 2 to 4096, got 1");
    EXPECT_EQ(refusal("apsk:4000+4000:2"), "\"apsk:4000+4000:2\": the size must be 2 to 4096, got 8000");
    EXPECT_EQ(refusal("std:"), "no constellation is named \"std:\"; the closest name is psk:8");
    EXPECT_EQ(refusal("16qam"), "no constellation is named \"16qam\"; the closest name is psk:8");
}
