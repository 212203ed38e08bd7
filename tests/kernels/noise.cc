// SPDX-License-Identifier: GPL-3.0-or-later
// complex_noise: the generator's published vectors, the construction sample by sample, moments and tails.
#include "halfplane/kernels/noise.h"

#include "../../lib/kernels/philox.h"
#include "halfplane/kernels/target.h"

#include <boost/math/special_functions/erf.hpp>
#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <limits>
#include <vector>

using namespace halfplane;
using kernels::complex_noise;
using kernels::philox;
using sample = std::complex<float>;

namespace {

/// Standard normal quantile of a two-sided 1 − 1e-6: each check below fails by chance once in a million
/// seeds.
constexpr double z_limit = 4.8916;

std::vector<std::string> targets()
{
    return kernels::usable_targets();
}

} // namespace

TEST(noise, philox_known_answers)
{
    // Known-answer vectors of the authors' distribution (Random123, kat_vectors, philox4x32 10), from memory;
    // the third takes digits of π as input.
    using words = std::array<std::uint32_t, 4>;
    EXPECT_EQ(philox::block({0, 0, 0, 0}, 0, 0), (words{0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8}));
    constexpr std::uint32_t ones = 0xffffffff;
    EXPECT_EQ(philox::block({ones, ones, ones, ones}, ones, ones),
              (words{0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd}));
    EXPECT_EQ(philox::block({0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344}, 0xa4093822, 0x299f31d0),
              (words{0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1}));
    // C++26 [rand.predef]: the 10000th invocation of a default-constructed philox4x32 gives 1955073260 (from
    // memory); its default seed 20111115 is the first key word, its counter starts at zero.
    EXPECT_EQ(philox::block({2499, 0, 0, 0}, 20111115u, 0)[3], 1955073260u);
}

TEST(noise, every_target_draws_the_same_floats_and_follows_the_construction)
{
    constexpr std::size_t count = 100001;
    for (const std::uint64_t seed : {0ull, 1ull, 0x123456789abcdef0ull})
        for (const std::uint64_t first : {0ull, 7ull, (1ull << 33) - 50001ull}) {
            const complex_noise noise(seed, seed / 3);
            std::vector<sample> plain(count), drawn(count);
            kernels::use_target("baseline");
            noise.draw(first, count, 2.0, plain.data());
            double worst = 0;
            for (std::size_t k = 0; k < count; k += 13) {
                const std::complex<double> expected = std::sqrt(2.0) * noise.reference(first + k);
                worst =
                    std::max(worst, std::abs(std::complex<double>(plain[k]) - expected) / std::abs(expected));
            }
            EXPECT_LT(worst, complex_noise::relative_accuracy);
            std::printf("worst relative error of a sample: %.2e\n", worst);
            for (const std::string& target : targets()) {
                kernels::use_target(target);
                noise.draw(first, count, 2.0, drawn.data());
                EXPECT_EQ(drawn, plain) << target;
            }
        }
}

TEST(noise, any_stretch_can_be_drawn_anywhere)
{
    const complex_noise noise(42, 7);
    std::vector<sample> whole(200000);
    noise.draw(0, whole.size(), 1.0, whole.data());
    for (const std::string& target : targets()) {
        kernels::use_target(target);
        for (const std::size_t first : {0u, 1u, 255u, 256u, 1001u})
            for (const std::size_t count : {0u, 1u, 7u, 255u, 1023u, 131071u}) {
                std::vector<sample> part(count + 1, sample(99, 99));
                noise.draw(first, count, 1.0, part.data());
                EXPECT_TRUE(
                    std::equal(part.begin(), part.end() - 1, whole.begin() + static_cast<long>(first)));
                EXPECT_EQ(part.back(), sample(99, 99));
            }
    }
    std::vector<sample> added(1000, sample(3, -4));
    noise.add(10, added.size(), 1.0, added.data());
    for (std::size_t k = 0; k < added.size(); ++k)
        EXPECT_EQ(added[k], sample(3, -4) + whole[10 + k]);
}

TEST(noise, the_rare_fine_bits_reach_the_far_tail)
{
    // Of 2^24 samples 2^12 are expected to have a radius word below 2^20; these follow the 64-bit branch of
    // the construction. Compared with the reference, all of them.
    const complex_noise noise(9);
    constexpr std::size_t count = 1 << 24, step = 1 << 16;
    std::vector<sample> z(step);
    std::size_t rare = 0;
    double worst = 0, largest = 0;
    for (std::size_t first = 0; first < count; first += step) {
        noise.draw(first, step, 1.0, z.data());
        for (std::size_t k = 0; k < step; ++k)
            if (std::norm(z[k]) > 12 * std::log(2.0)) { // |z|² = −ln u
                ++rare;
                const std::complex<double> expected = noise.reference(first + k);
                worst = std::max(worst, std::abs(std::complex<double>(z[k]) - expected) / std::abs(expected));
                largest = std::max(largest, std::abs(expected));
            }
    }
    std::printf(
        "%zu samples beyond 2^-12, worst relative error %.2e, largest |z| %.3f\n", rare, worst, largest);
    EXPECT_NEAR(static_cast<double>(rare), 4096.0, z_limit * std::sqrt(4096.0));
    EXPECT_LT(worst, complex_noise::relative_accuracy);
}

TEST(noise, moments_and_tails)
{
    constexpr std::size_t count = 400'000'000, step = 100'000;
    const complex_noise noise(20240607, 3);
    std::vector<sample> z(step);
    std::array<std::uint64_t, 3> beyond{};
    double sum = 0, squares = 0, fourth = 0, cross = 0, lag = 0;
    float last = 0;
    for (std::size_t first = 0; first < count; first += step) {
        noise.draw(first, step, 2.0, z.data()); // unit variance a dimension
        for (const sample s : z) {
            for (const double x : {s.real(), s.imag()}) {
                sum += x, squares += x * x, fourth += x * x * x * x;
                for (int sigmas = 3; sigmas <= 5; ++sigmas)
                    beyond[static_cast<std::size_t>(sigmas - 3)] += std::abs(x) > sigmas;
            }
            cross += static_cast<double>(s.real()) * s.imag();
            lag += static_cast<double>(s.real()) * last;
            last = s.imag();
        }
    }
    const double n = 2.0 * count;
    const auto report = [](const char* what, double z_score) {
        std::printf("%-32s z = %+.2f\n", what, z_score);
        EXPECT_LT(std::abs(z_score), z_limit) << what;
    };
    report("mean", sum / std::sqrt(n));
    report("variance", (squares - n) / std::sqrt(2 * n));
    report("fourth moment", (fourth - 3 * n) / std::sqrt(96 * n)); // var x⁴ = 105 − 9
    report("real × imaginary", cross / std::sqrt(n / 2));
    report("real × the imaginary before", lag / std::sqrt(n / 2));
    for (int sigmas = 3; sigmas <= 5; ++sigmas) {
        const double expected = n * boost::math::erfc(sigmas / std::sqrt(2.0));
        const double counted = static_cast<double>(beyond[static_cast<std::size_t>(sigmas - 3)]);
        std::printf("beyond %d sigma: %.0f, expected %.1f\n", sigmas, counted, expected);
        report("tail", (counted - expected) / std::sqrt(expected));
    }
}

TEST(noise, streams_and_seeds_differ)
{
    std::vector<sample> a(1000), b(1000), c(1000);
    complex_noise(1, 0).draw(0, 1000, 1.0, a.data());
    complex_noise(1, 1).draw(0, 1000, 1.0, b.data());
    complex_noise(2, 0).draw(0, 1000, 1.0, c.data());
    for (std::size_t k = 0; k < a.size(); ++k)
        EXPECT_TRUE(a[k] != b[k] && a[k] != c[k] && b[k] != c[k]);
}

TEST(noise, refuses_a_density_that_is_none)
{
    sample z;
    for (const double n0 : {-1.0, std::nan(""), std::numeric_limits<double>::infinity()})
        EXPECT_THROW(complex_noise(1).draw(0, 1, n0, &z), std::invalid_argument) << n0;
    complex_noise(1).draw(0, 1, 0.0, &z);
    EXPECT_EQ(z, sample(0, 0));
}
