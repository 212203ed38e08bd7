// SPDX-License-Identifier: GPL-3.0-or-later
// geometry: facts known from elsewhere or counted by hand, brute force, rounded coordinates, refusals.
#include "halfplane/geometry.h"
#include "halfplane/cells.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <random>
#include <string>

using namespace halfplane;

namespace {

const double pi = std::acos(-1.0);

signal_set rounded(const signal_set& set, double unit)
{
    auto points = set.points();
    for (auto& p : points)
        p = {std::round(p.real() / unit) * unit, std::round(p.imag() / unit) * unit};
    return {points, set.labels(), set.label_bits(), {}, set.name()};
}

std::size_t facing_pairs(const signal_set& set, double tolerance = default_tolerance)
{
    std::size_t pairs = 0;
    for (const auto& list : facing_points(set, tolerance))
        pairs += list.size();
    return pairs;
}

/// Every map carries every point where its permutation says, and the permutation is one to one.
void expect_maps_hold(const signal_set& set, double tolerance = default_tolerance, complex centre = {})
{
    const auto all = symmetries(set, tolerance, centre);
    const auto count = count_symmetries(set, tolerance, centre);
    ASSERT_EQ(all.size(), count.rotations + count.mirrors);
    for (std::size_t k = 0; k < all.size(); ++k) {
        const auto& m = all[k];
        EXPECT_EQ(m.mirrored, k >= count.rotations);
        EXPECT_GE(m.angle_rad, 0);
        EXPECT_LT(m.angle_rad, 2 * pi);
        if (k > 0 && all[k - 1].mirrored == m.mirrored) {
            EXPECT_GT(m.angle_rad, all[k - 1].angle_rad);
        }
        std::vector<bool> taken(set.size());
        for (std::size_t i = 0; i < set.size(); ++i) {
            const complex z = set.points()[i] - centre;
            const complex image = centre + std::polar(1.0, m.angle_rad) * (m.mirrored ? std::conj(z) : z);
            EXPECT_LE(std::abs(image - set.points()[m.permutation[i]]), (tolerance + 1e-9) * set.d_min());
            EXPECT_FALSE(taken[m.permutation[i]]);
            taken[m.permutation[i]] = true;
        }
    }
    for (std::size_t i = 0; i < set.size(); ++i)
        EXPECT_EQ(all[0].permutation[i], i);
}

} // namespace

TEST(Symmetries, CountsKnownFromGeometry)
{
    struct row {
        const char* name;
        std::size_t rotations, mirrors;
    };
    for (const auto& r : {row{"psk:2", 2, 2},
                          row{"psk:3", 3, 3},
                          row{"psk:8", 8, 8},
                          row{"psk:17", 17, 17},
                          row{"qam:8", 2, 2},
                          row{"qam:16", 4, 4},
                          row{"qam:1024", 4, 4},
                          row{"cross:32", 4, 4},
                          row{"hex:7", 6, 6},
                          row{"hex:19", 6, 6},
                          row{"hex:3", 3, 3},
                          row{"star:4+4", 4, 4},
                          row{"apsk:4+12:2.85", 4, 4},
                          row{"apsk:4+8:2.3", 4, 4},
                          row{"apsk:1+7", 7, 7},
                          row{"apsk:3+5:2", 1, 1},
                          row{"std:302755/rotated-16qam", 4, 4},
                          row{"std:302307-1/32apsk/3-4", 4, 4}}) {
        const auto count = count_symmetries(named_set(r.name));
        EXPECT_EQ(count.rotations, r.rotations) << r.name;
        EXPECT_EQ(count.mirrors, r.mirrors) << r.name;
        expect_maps_hold(named_set(r.name));
    }
}

TEST(Symmetries, ChiralSetHasRotationsOnly)
{
    // Two rings of four, the outer one turned by an odd angle: a quarter turn stays, mirrors do not.
    std::vector<complex> points;
    for (int k = 0; k < 4; ++k)
        points.push_back(std::polar(1.0, k * pi / 2));
    for (int k = 0; k < 4; ++k)
        points.push_back(std::polar(2.0, k * pi / 2 + 0.3));
    for (int k = 0; k < 4; ++k)
        points.push_back(std::polar(3.0, k * pi / 2 + 0.2));
    const auto set = signal_set::with_natural_labels(points);
    const auto count = count_symmetries(set);
    EXPECT_EQ(count.rotations, 4u);
    EXPECT_EQ(count.mirrors, 0u);
    expect_maps_hold(set);
}

TEST(Symmetries, PriorsAndTheCentreCount)
{
    const auto square = named_set("qam:4");
    const auto skewed = square.with_priors({0.4, 0.1, 0.1, 0.4}); // opposite corners alike
    EXPECT_EQ(count_symmetries(skewed).rotations, 2u);
    EXPECT_EQ(count_symmetries(skewed).mirrors, 2u);
    expect_maps_hold(skewed);
    EXPECT_EQ(count_symmetries(square.with_priors({0.4, 0.3, 0.2, 0.1})).rotations, 1u);
    const auto moved = square.translated({10, 0});
    EXPECT_EQ(count_symmetries(moved).rotations, 1u);
    EXPECT_EQ(count_symmetries(moved).mirrors, 1u); // about the real axis
    EXPECT_EQ(count_symmetries(moved, default_tolerance, {10, 0}).rotations, 4u);
    expect_maps_hold(moved, default_tolerance, {10, 0});
    EXPECT_EQ(count_symmetries(square.translated({1e6, 2e6}), default_tolerance, {1e6, 2e6}).mirrors, 4u);
}

TEST(Symmetries, RandomSetHasTheIdentityOnly)
{
    std::mt19937_64 next(3);
    std::normal_distribution<double> normal;
    for (std::size_t m : {3u, 16u, 300u}) {
        std::vector<complex> points(m);
        for (auto& p : points)
            p = {normal(next), normal(next)};
        const auto count = count_symmetries(signal_set::with_natural_labels(points));
        EXPECT_EQ(count.rotations + count.mirrors, 1u);
    }
}

TEST(Symmetries, OrderOfIndicesDoesNotMatterAndAnyTurnIsFound)
{
    std::mt19937_64 next(4);
    for (const char* name : {"qam:64", "hex:19", "apsk:4+12+16:2.84,5.27"}) {
        const auto plain = named_set(name).scaled(std::polar(3.0, 1.234));
        auto points = plain.points();
        std::shuffle(points.begin(), points.end(), next);
        const auto set = signal_set::with_natural_labels(points);
        EXPECT_EQ(count_symmetries(set).rotations, count_symmetries(named_set(name)).rotations) << name;
        EXPECT_EQ(count_symmetries(set).mirrors, count_symmetries(named_set(name)).mirrors) << name;
        expect_maps_hold(set);
    }
}

TEST(Tolerance, RingOfEightWithFourDecimalsIsStillARing)
{
    const auto ring = rounded(named_set("psk:8").scaled(std::polar(1.0, 0.2)), 1e-4);
    const auto facts = inspect(ring);
    EXPECT_EQ(facts.rotations, 8u);
    EXPECT_EQ(facts.mirrors, 8u);
    EXPECT_TRUE(facts.gray);
    EXPECT_TRUE(facts.gray_among_closest);
    EXPECT_EQ(facts.mean_facing, 2);
    EXPECT_EQ(facts.closest_pairs, 16u);
    EXPECT_EQ(facts.distances.size(), 4u);
    expect_maps_hold(ring);
    // Without a tolerance only quarter turns are left, which rounding commutes with.
    EXPECT_EQ(count_symmetries(ring, 0).rotations, 4u);
}

TEST(Tolerance, RoundedFamiliesKeepTheirFacts)
{
    // Four decimals are 5e-4 of d_min at most here, a tenth of a per cent with both coordinates of two
    // points.
    for (const char* name :
         {"qam:16", "qam:64", "psk:16", "hex:19", "hex:37", "apsk:4+12:2.85", "cross:32"}) {
        const auto plain = named_set(name), set = rounded(plain.scaled(std::polar(1.0, 0.7)), 1e-4);
        const auto a = inspect(plain), b = inspect(set);
        EXPECT_EQ(a.facing, b.facing) << name;
        EXPECT_EQ(a.rotations, b.rotations) << name;
        EXPECT_EQ(a.mirrors, b.mirrors) << name;
        EXPECT_EQ(a.closest_pairs, b.closest_pairs) << name;
        EXPECT_EQ(a.gray, b.gray) << name;
        EXPECT_EQ(a.distances.size(), b.distances.size()) << name;
    }
}

TEST(Facing, GridsAndRingsByHand)
{
    // Square grid, side n: 4n(n − 1) ordered pairs; corners that touch are not facing.
    EXPECT_EQ(facing_pairs(named_set("qam:16")), 4u * 4 * 3);
    EXPECT_EQ(facing_pairs(named_set("qam:1024")), 4u * 32 * 31);
    EXPECT_EQ(facing_pairs(named_set("qam:8")), 2u * (2 * 3 + 4));
    EXPECT_EQ(facing_pairs(named_set("psk:64")), 128u);
    // Hexagonal shells of radius n: 3n(3n + 1) edges between neighbours at d_min, and no others.
    EXPECT_EQ(facing_pairs(named_set("hex:7")), 2u * 12);
    EXPECT_EQ(facing_pairs(named_set("hex:19")), 2u * 42);
    // Two points; three on a line.
    EXPECT_EQ(facing_pairs(named_set("psk:2")), 2u);
    EXPECT_EQ(facing_pairs(signal_set::with_natural_labels({{-1, 0}, {0, 0}, {5, 0}})), 4u);
}

TEST(Facing, AgreesWithTheExactCellsWhereNothingIsClose)
{
    std::mt19937_64 next(8);
    std::normal_distribution<double> normal;
    std::size_t pairs = 0, dropped = 0;
    for (int round = 0; round < 200; ++round) {
        std::vector<complex> points(3 + next() % 60);
        for (auto& p : points)
            p = {normal(next) / 4, normal(next) / 4};
        const auto set = signal_set::with_natural_labels(points);
        const cells exact(points);
        const auto none = facing_points(set, 0), tiny = facing_points(set, 1e-9), usual = facing_points(set);
        for (std::size_t i = 0; i < points.size(); ++i) {
            EXPECT_EQ(none[i], exact.facing(i));
            EXPECT_EQ(tiny[i], exact.facing(i));
            EXPECT_TRUE(std::includes(none[i].begin(), none[i].end(), usual[i].begin(), usual[i].end()));
            pairs += none[i].size();
            dropped += none[i].size() - usual[i].size();
        }
    }
    std::printf("random sets: %zu of %zu facing pairs closed by the tolerance\n", dropped, pairs);
    EXPECT_LT(dropped * 50, pairs);
}

TEST(Facing, ToleranceIsTheRoomAroundAnEdge)
{
    // A square sheared a little: the edge across its short diagonal closes once the room that
    // the definition asks for exceeds what a search along the edge finds.
    const signal_set set = signal_set::with_natural_labels({{0, 0}, {2, 0}, {0.2, 2}, {2.2, 2}});
    double best = 0; // points 1 and 2 face each other across the middle
    for (int k = -100000; k <= 100000; ++k) {
        const complex middle = (set.points()[1] + set.points()[2]) / 2.0,
                      d = set.points()[2] - set.points()[1];
        const complex x = middle + complex(-d.imag(), d.real()) * (k * 1e-5);
        const double rho = std::abs(x - set.points()[1]);
        best = std::max(best, std::min(std::abs(x - set.points()[0]), std::abs(x - set.points()[3])) - rho);
    }
    const double limit = best / (2 * set.d_min());
    const auto faces = [&](double tolerance) {
        const auto list = facing_points(set, tolerance)[1];
        return std::count(list.begin(), list.end(), 2u) == 1;
    };
    std::printf("room %.6f of d_min\n", limit);
    EXPECT_GT(limit, 0.01);
    EXPECT_TRUE(faces(limit * 0.999));
    EXPECT_FALSE(faces(limit * 1.001));
}

TEST(Inspect, TwelvePointsByHand)
{
    const auto facts = inspect(load_set(HALFPLANE_SOURCE_DIR "/examples/sets/firn-12.json"));
    EXPECT_EQ(facts.name, "firn-12");
    EXPECT_EQ(facts.size, 12u);
    EXPECT_EQ(facts.label_bits, 4u);
    EXPECT_NEAR(facts.entropy_bits, std::log2(12.0), 1e-15);
    EXPECT_NEAR(facts.es, (4 * 1 + 8 * 2.3 * 2.3) / 12, 1e-12);
    EXPECT_NEAR(facts.eb, facts.es / std::log2(12.0), 1e-12);
    EXPECT_NEAR(facts.papr_db, 10 * std::log10(2.3 * 2.3 / facts.es), 1e-12);
    // Inner neighbours at √2 are the closest: 8 ordered pairs; labels 00 01 10 11 around, so 1, 2, 1, 2 bits.
    EXPECT_NEAR(facts.d_min, std::sqrt(2.0), 1e-12);
    EXPECT_EQ(facts.closest_pairs, 8u);
    EXPECT_NEAR(facts.mean_closest, 8.0 / 12, 1e-15);
    EXPECT_FALSE(facts.gray);
    EXPECT_FALSE(facts.gray_among_closest);
    // Inner points face two inner and two outer ones, outer ones two outer and one inner.
    for (std::size_t i = 0; i < 4; ++i)
        EXPECT_EQ(facts.facing[i].size(), 4u);
    for (std::size_t i = 4; i < 12; ++i)
        EXPECT_EQ(facts.facing[i].size(), 3u);
    EXPECT_NEAR(facts.mean_facing, (4 * 4 + 8 * 3) / 12.0, 1e-15);
    EXPECT_EQ(facts.distances.front().pairs, 8u);
    std::uint64_t pairs = 0;
    for (const auto& d : facts.distances)
        pairs += d.pairs;
    EXPECT_EQ(pairs, 12u * 11);
    EXPECT_NEAR(facts.mean_i, 0, 1e-15);
    EXPECT_NEAR(facts.mean_q, 0, 1e-15);
}

TEST(Inspect, QamHasTheDistancesOfTheLattice)
{
    const auto facts = inspect(named_set("qam:64"));
    EXPECT_TRUE(facts.gray);
    EXPECT_EQ(facts.facing_bit_distance, 1);
    EXPECT_EQ(facts.closest_pairs, 4u * 8 * 7);
    EXPECT_EQ(facts.mean_closest, 4.0 * 7 / 8);
    // d² = 4(a² + b²), 0 ≤ a, b ≤ 7, with (8 − a)(8 − b) places and up to four directions.
    for (const auto& d : facts.distances) {
        std::uint64_t pairs = 0;
        for (int a = -7; a <= 7; ++a)
            for (int b = -7; b <= 7; ++b)
                if (std::abs(2 * std::hypot(a, b) - d.d) < 1e-9)
                    pairs += static_cast<std::uint64_t>((8 - std::abs(a)) * (8 - std::abs(b)));
        EXPECT_EQ(d.pairs, pairs) << d.d;
    }
    EXPECT_EQ(inspect(named_set("qam:64"), 1e-3, 5).distances.size(), 5u);
}

TEST(Inspect, Refusals)
{
    const auto refusal = [](auto f) {
        try {
            f();
        } catch (const std::invalid_argument& e) {
            return std::string(e.what());
        }
        return std::string("accepted");
    };
    const auto set = named_set("qam:4");
    const std::string text = "tolerance must lie in 0 … 0.25 (below), got ";
    EXPECT_EQ(refusal([&] { inspect(set, -1); }), text + "-1");
    EXPECT_EQ(refusal([&] { inspect(set, 0.25); }), text + "0.25");
    EXPECT_EQ(refusal([&] { symmetries(set, NAN); }), text + "nan");
    EXPECT_EQ(refusal([&] { facing_points(set, 1); }), text + "1");
    EXPECT_EQ(refusal([&] { distance_profile(set, 1); }), text + "1");
    EXPECT_EQ(refusal([&] {
                  count_symmetries(set, 0.1, {INFINITY, 0});
              }),
              "centre must be finite, got (inf, 0)");
}
