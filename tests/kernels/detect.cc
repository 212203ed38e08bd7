// SPDX-License-Identifier: GPL-3.0-or-later
// point_decider against brute force in double precision, on every instruction set that this machine has.
#include "halfplane/kernels/detect.h"

#include "halfplane/kernels/target.h"
#include "sample_sets.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <cstring>
#include <functional>
#include <limits>
#include <random>

using namespace halfplane;
using halfplane::kernels::point_decider;
using sample = std::complex<float>;

namespace {

constexpr std::size_t kinds = 9;
std::array<std::uint64_t, kinds> compared{}; // by kind

float nudged(float x, int steps)
{
    const float towards =
        steps > 0 ? std::numeric_limits<float>::infinity() : -std::numeric_limits<float>::infinity();
    for (int s = 0; s < std::abs(steps); ++s)
        x = std::nextafter(x, towards);
    return x;
}

/// The kinds of sample that a decision by table could get wrong.
struct sample_source {
    const signal_set& set;
    std::mt19937_64 bits;

    double uniform() { return std::uniform_real_distribution<double>(0, 1)(bits); }
    double normal() { return std::normal_distribution<double>()(bits); }
    complex point() { return set.points()[bits() % set.size()]; }
    int few() { return static_cast<int>(bits() % 5) - 2; }
    static sample cut(complex z) { return {static_cast<float>(z.real()), static_cast<float>(z.imag())}; }

    sample near() { return cut(point() + 0.3 * set.d_min() * complex(normal(), normal())); }
    sample spread() { return cut(set.mean() + 2 * std::sqrt(set.es()) * complex(normal(), normal())); }
    /// On the line midway between two points, or a few floats beside it.
    sample on_edge()
    {
        const complex a = point(), b = point(), along = (b - a) * complex(0, 1);
        const sample r = cut((a + b) / 2.0 + along * (bits() % 2 ? 0.0 : normal()));
        return {nudged(r.real(), few()), nudged(r.imag(), few())};
    }
    sample on_point()
    {
        const sample r = cut(point());
        return {nudged(r.real(), few()), nudged(r.imag(), few())};
    }
    sample far()
    {
        const double size = std::sqrt(set.es()) * std::pow(10.0, 38 * uniform());
        return {static_cast<float>(std::clamp(size * normal(), -3e38, 3e38)),
                static_cast<float>(std::clamp(size * normal(), -3e38, 3e38))};
    }
    /// Far out along an axis, a diagonal, or an edge between two points: where all depends on the constant
    /// term.
    sample far_on_edge()
    {
        const complex along = bits() % 2 ? (point() - point()) * complex(0, 1) : complex(few(), few());
        const complex from = bits() % 2 ? complex{} : (point() + point()) / 2.0;
        const complex z = from + along * std::ldexp(uniform() + 0.5, static_cast<int>(bits() % 100));
        return {nudged(static_cast<float>(std::clamp(z.real(), -3e38, 3e38)), few()),
                nudged(static_cast<float>(std::clamp(z.imag(), -3e38, 3e38)), few())};
    }
    sample tiny()
    {
        const auto one = [&] {
            const std::uint32_t pattern =
                static_cast<std::uint32_t>(bits() & 0x807fffffu); // denormals and ±0
            float x;
            std::memcpy(&x, &pattern, sizeof x);
            return bits() % 4 ? x : std::copysign(0.0f, x);
        };
        return {one(), one()};
    }
    /// Any bit pattern: NaN, Inf, denormal, huge.
    sample any_bits()
    {
        const std::uint64_t pattern = bits();
        sample r;
        std::memcpy(static_cast<void*>(&r), &pattern, sizeof r);
        return r;
    }
    sample broken()
    {
        constexpr float bad[] = {std::numeric_limits<float>::quiet_NaN(),
                                 std::numeric_limits<float>::infinity(),
                                 -std::numeric_limits<float>::infinity(),
                                 std::numeric_limits<float>::max(),
                                 std::numeric_limits<float>::lowest(),
                                 0.0f};
        return {bad[bits() % 6], bits() % 2 ? bad[bits() % 6] : static_cast<float>(normal())};
    }

    sample next(unsigned kind)
    {
        switch (kind % kinds) {
        case 0:
            return near();
        case 1:
            return spread();
        case 2:
            return on_edge();
        case 3:
            return on_point();
        case 4:
            return far();
        case 5:
            return far_on_edge();
        case 6:
            return tiny();
        case 7:
            return any_bits();
        default:
            return broken();
        }
    }
};

void expect_equal_decisions(const signal_set& set,
                            const point_decider& decider,
                            std::size_t count,
                            unsigned seed)
{
    sample_source source{set, std::mt19937_64(seed)};
    std::vector<sample> in(count);
    for (std::size_t k = 0; k < count; ++k)
        in[k] = source.next(static_cast<unsigned>(k));
    std::vector<std::uint16_t> expected(count), decided(count);
    decider.decide_reference(in.data(), expected.data(), count);
    const std::string before = kernels::target();
    for (const std::string& target : kernels::usable_targets()) {
        kernels::use_target(target);
        std::fill(decided.begin(), decided.end(), std::uint16_t{0x7777});
        decider.decide(in.data(), decided.data(), count);
        std::size_t wrong = 0;
        for (std::size_t k = 0; k < count; ++k)
            if (decided[k] != expected[k] && ++wrong <= 3)
                ADD_FAILURE() << set.name() << " on " << target << ": sample " << in[k] << " of kind "
                              << k % kinds << " decided " << decided[k] << ", brute force " << expected[k];
        ASSERT_EQ(wrong, 0u) << set.name() << " on " << target << ", of " << count;
    }
    kernels::use_target(before);
    for (std::size_t kind = 0; kind < kinds; ++kind)
        compared[kind] += (count + kinds - 1 - kind) / kinds;
}

std::vector<signal_set> small_sets()
{
    using namespace sample_sets;
    std::vector<signal_set> sets;
    sets.push_back(signal_set::with_natural_labels({{-1, 0}, {1, 0}}, "pair"));
    sets.push_back(ring(4));
    sets.push_back(grid(2, 2));
    sets.push_back(ring(8));
    sets.push_back(two_rings(4, 8, 2.1));
    sets.push_back(grid(4, 4));
    sets.push_back(grid(4, 4).scaled(std::polar(0.37, 0.41)).renamed("grid turned"));
    sets.push_back(grid(16, 1));
    sets.push_back(ring(64));
    sets.push_back(random(7, 1));
    sets.push_back(random(33, 2));
    return sets;
}

} // namespace

TEST(detect, equals_brute_force_on_small_sets)
{
    // 9,000,000 samples a set: of every kind more than 1e7.
    const auto before = compared;
    unsigned seed = 1000;
    for (const signal_set& set : small_sets())
        for (int piece = 0; piece < 10; ++piece)
            expect_equal_decisions(set, point_decider(set), 900000, ++seed);
    static constexpr const char* names[kinds] = {"near a point",
                                                 "spread",
                                                 "on an edge",
                                                 "on a point",
                                                 "far outside",
                                                 "far out on an edge",
                                                 "denormal",
                                                 "any bits",
                                                 "NaN, Inf, largest"};
    for (std::size_t kind = 0; kind < kinds; ++kind) {
        std::printf(
            "%-20s %llu\n", names[kind], static_cast<unsigned long long>(compared[kind] - before[kind]));
        EXPECT_GE(compared[kind] - before[kind], 10'000'000u);
    }
}

TEST(detect, equals_brute_force_on_large_sets)
{
    unsigned seed = 200;
    for (const signal_set& set :
         {sample_sets::grid(8, 8), sample_sets::random(256, 3), sample_sets::ring(256)})
        expect_equal_decisions(set, point_decider(set), 200000, ++seed);
    for (const signal_set& set : {sample_sets::grid(32, 32),
                                  sample_sets::grid(64, 64),
                                  sample_sets::random(4096, 4),
                                  sample_sets::ring(4096)})
        expect_equal_decisions(set, point_decider(set), 200000, ++seed);
}

TEST(detect, equals_brute_force_where_points_lie_close)
{
    // Sets that get a fine grid of pages, with and without priors.
    unsigned seed = 250;
    const std::pair<signal_set, std::size_t> cases[] = {{sample_sets::ring(64), 9000000},
                                                        {sample_sets::ring(256), 900000},
                                                        {sample_sets::ring(1024), 270000},
                                                        {sample_sets::random(1024, 7), 270000},
                                                        {sample_sets::random(4096, 8), 90000}};
    for (const auto& [set, count] : cases)
        expect_equal_decisions(set, point_decider(set), count, ++seed);
    const signal_set off_centre = sample_sets::ring(256).translated({30, -7}).renamed("ring off centre");
    expect_equal_decisions(off_centre, point_decider(off_centre), 450000, ++seed);
    const signal_set shaped =
        sample_sets::with_shaped_priors(sample_sets::ring(256).translated({0.5, 0}), 3.0);
    for (const double es_n0 : {10.0, 1e3, 1e5})
        expect_equal_decisions(shaped, point_decider(shaped, shaped.es() / es_n0), 270000, ++seed);
}

TEST(detect, equals_brute_force_with_priors)
{
    unsigned seed = 300;
    for (const signal_set& plain :
         {sample_sets::grid(4, 4), sample_sets::two_rings(4, 8, 2.1), sample_sets::random(33, 5)})
        for (const double strength : {0.1, 1.0, 5.0}) {
            const signal_set set = sample_sets::with_shaped_priors(plain, strength);
            // From noise so weak that priors hardly matter to noise so strong that some points never win.
            for (const double es_n0_db : {-10.0, 0.0, 10.0, 30.0}) {
                const double n0 = set.es() / std::pow(10.0, es_n0_db / 10);
                expect_equal_decisions(set, point_decider(set, n0), 45000, ++seed);
            }
        }
    const signal_set large = sample_sets::with_shaped_priors(sample_sets::grid(32, 32), 1.0);
    expect_equal_decisions(large, point_decider(large, large.es() / 1000), 40000, ++seed);
}

TEST(detect, equals_brute_force_on_awkward_sets)
{
    unsigned seed = 400;
    std::vector<signal_set> sets;
    const signal_set square = sample_sets::grid(4, 4);
    // Far from the origin: the metric itself loses digits there, and the decision follows brute force all the
    // same.
    for (const double offset : {10.0, 1e3, 1e6, 1e9, 1e15})
        sets.push_back(square.translated({offset, -offset}).renamed("offset"));
    for (const double factor : {1e-50, 1e-44, 1e-38, 1e-20, 1e20, 1e30, 1e37, 1e60, 1e120, 1e-120})
        sets.push_back(square.scaled(factor).renamed("scaled"));
    // A tight cluster in a wide set, and clusters within clusters.
    std::vector<complex> nested;
    for (int level = 0; level < 10; ++level)
        for (int i = 0; i < 9; ++i)
            nested.push_back(std::polar(std::pow(0.1, level), 0.1 * level + 2 * M_PI * i / 9));
    sets.push_back(signal_set::with_natural_labels(nested, "nested"));
    std::vector<complex> spiky = sample_sets::random(200, 6).points();
    for (complex& s : spiky)
        s *= 1e-4;
    spiky.emplace_back(1, 1), spiky.emplace_back(-3, 0.5), spiky.emplace_back(100, 0);
    sets.push_back(signal_set::with_natural_labels(spiky, "cluster"));
    for (const signal_set& set : sets)
        expect_equal_decisions(set, point_decider(set), 27000, ++seed);
}

TEST(detect, awkward_lengths_and_unaligned_arrays)
{
    const signal_set set = sample_sets::two_rings(4, 8, 2.1);
    const point_decider decider(set);
    sample_source source{set, std::mt19937_64(5)};
    for (const std::size_t count : {0u, 1u, 7u, 511u, 512u, 513u, 1023u, 131071u})
        for (const std::size_t shift : {0u, 1u, 3u}) {
            std::vector<sample> in(count + shift);
            for (std::size_t k = 0; k < in.size(); ++k)
                in[k] = source.next(static_cast<unsigned>(k));
            std::vector<std::uint16_t> expected(count), decided(count + shift + 4, 0x7777);
            decider.decide_reference(in.data() + shift, expected.data(), count);
            for (const std::string& target : kernels::usable_targets()) {
                kernels::use_target(target);
                decider.decide(in.data() + shift, decided.data() + shift, count);
                EXPECT_TRUE(
                    std::equal(expected.begin(), expected.end(), decided.begin() + static_cast<long>(shift)));
                for (std::size_t k = 0; k < 4; ++k) // nothing written beyond the end
                    EXPECT_EQ(decided[shift + count + k], 0x7777);
            }
        }
}

TEST(detect, ties_go_to_the_lower_index)
{
    const signal_set set = signal_set::with_natural_labels({{1, 1}, {-1, 1}, {-1, -1}, {1, -1}});
    const point_decider decider(set);
    const std::vector<sample> in{{0, 0}, {0, 1}, {-1, 0}, {0, -1}, {1, 0}, {0, 1e38f}};
    const std::vector<std::uint16_t> expected{0, 0, 1, 2, 0, 0};
    std::vector<std::uint16_t> decided(in.size());
    decider.decide(in.data(), decided.data(), in.size());
    EXPECT_EQ(decided, expected);
}

TEST(detect, refuses_a_noise_density_that_is_none)
{
    const signal_set set = sample_sets::ring(4);
    for (const double n0 : {0.0, -1.0, std::nan(""), std::numeric_limits<double>::infinity()})
        EXPECT_THROW(point_decider(set, n0), std::invalid_argument) << n0;
    EXPECT_THROW(kernels::use_target("none such"), std::invalid_argument);
}
