// SPDX-License-Identifier: GPL-3.0-or-later
// premises: uniform p-values where they hold, and the faults that each must name.
#include "halfplane/premises.h"
#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <map>
#include <random>

using namespace halfplane;

namespace {

constexpr double degree = 0.017453292519943295;

/// Received symbol of sent ones (`s[k − j]` is before by j, j ≤ 4) and unit complex noise; k counts symbols.
using receiver =
    std::function<complex(const complex* s, complex noise, std::uint64_t k, std::mt19937_64& random)>;

std::vector<premise> premises_of(
    const signal_set& set, std::size_t symbols, double es_n0_db, std::uint64_t seed, const receiver& receive)
{
    std::mt19937_64 random(seed);
    std::normal_distribution<double> normal;
    const double sigma = std::sqrt(set.es() / from_db(es_n0_db) / 2);
    std::vector<complex> s(symbols + 4);
    std::vector<reference_t> sent(symbols);
    std::vector<std::complex<float>> in(symbols);
    for (std::size_t k = 0; k < symbols; ++k) {
        sent[k] = static_cast<reference_t>(random() % set.size());
        s[k + 4] = set.points()[static_cast<std::size_t>(sent[k])];
        const double i = normal(random), q = normal(random);
        in[k] = std::complex<float>(receive(&s[k + 4], sigma * complex(i, q), k, random));
    }
    residual_gatherer g(set);
    g.add(in.data(), sent.data(), symbols);
    return find_premises(g.take());
}

complex clean(const complex* s, complex noise, std::uint64_t, std::mt19937_64&)
{
    return *s + noise;
}

/// Names of those that fail.
std::vector<std::string> failing(const std::vector<premise>& all)
{
    std::vector<std::string> names;
    for (const auto& p : all)
        if (p.state == premise_state::fails)
            names.push_back(p.name);
    return names;
}

bool fails(const std::vector<premise>& all, const char* name)
{
    const auto names = failing(all);
    return std::find(names.begin(), names.end(), name) != names.end();
}

/// Largest distance of an empirical distribution from the uniform one (Kolmogorov and Smirnov).
double distance_from_uniform(std::vector<double> p)
{
    std::sort(p.begin(), p.end());
    const auto n = static_cast<double>(p.size());
    double worst = 0;
    for (std::size_t k = 0; k < p.size(); ++k)
        worst = std::max({worst, p[k] - static_cast<double>(k) / n, static_cast<double>(k + 1) / n - p[k]});
    return worst;
}

} // namespace

TEST(Premises, AreCalibratedWhereTheyHold)
{
    // 500 runs, eight statistics a set: each at 1e-3/16, so that all together are refused once in a thousand.
    // P(D > x/√n) ≈ 2·exp(−2x²) gives x = 2.28.
    constexpr int runs = 500;
    const double most = std::sqrt(std::log(2 * 16 / 1e-3) / 2) / std::sqrt(runs);
    for (const char* set_name : {"qam:16", "psk:8"}) {
        const auto set = named_set(set_name);
        std::map<std::string, std::vector<double>> p;
        int failed = 0;
        for (int run = 0; run < runs; ++run) {
            const auto all = premises_of(set, 50000, 18, 1000 + static_cast<std::uint64_t>(run), clean);
            for (const auto& one : all) {
                ASSERT_TRUE(one.p && one.effect_db) << one.name;
                p[one.name].push_back(*one.p);
            }
            failed += !failing(all).empty();
        }
        for (const auto& [name, values] : p) {
            ASSERT_EQ(values.size(), std::size_t{runs});
            const double d = distance_from_uniform(values);
            std::cout << set_name << ' ' << name << ": p off uniform by " << d << " (limit " << most << ")\n";
            EXPECT_LT(d, most) << name;
        }
        EXPECT_EQ(p.count("linear"), set.name() == "psk:8" ? 0u : 1u);
        EXPECT_LE(failed, 3) << "8e-4 of the runs are expected to: 0.4, and 3 with probability 8e-3";
    }
}

TEST(Premises, EachFaultIsNamedWithin1e5Symbols)
{
    struct fault {
        std::vector<std::string> named; // all that fails, in the order of the report
        const char* what;
        double es_n0_db;
        receiver receive;
    };
    const fault faults[] = {
        {{"circular", "gaussian"},
         "phase jitter of 3 degrees",
         20,
         [](const complex* s, complex noise, std::uint64_t, std::mt19937_64& random) {
             std::normal_distribution<double> normal;
             return (*s + noise) * std::polar(1.0, 3 * degree * normal(random));
         }},
        {{"no_memory"},
         "an echo at -25 dB",
         20,
         [](const complex* s, complex noise, std::uint64_t, std::mt19937_64&) {
             return *s + std::pow(10, -25.0 / 20) * std::polar(1.0, 2.0) * s[-1] + noise;
         }},
        {{"no_image"},
         "I/Q imbalance of 0.5 dB",
         20,
         [](const complex* s, complex noise, std::uint64_t, std::mt19937_64&) {
             const complex y = *s + noise;
             const double g = std::pow(10, 0.5 / 40);
             return complex(y.real() * g, y.imag() / g);
         }},
        {{"linear"},
         "compression by 0.5 dB at the corners",
         20,
         [](const complex* s, complex noise, std::uint64_t, std::mt19937_64&) {
             return *s * (1 - 0.056 * std::norm(*s) / 18) + noise; // 18: |corner|² of ±1, ±3
         }},
        {{"gaussian", "steady_noise"},
         "bursts of 200 symbols every 5000, noise four times as strong",
         20,
         [](const complex* s, complex noise, std::uint64_t k, std::mt19937_64&) {
             return *s + noise * (k % 5000 < 200 ? 2.0 : 1.0);
         }},
        {{"circular", "steady_noise", "steady_gain"},
         "a gain that fades by 1 dB to either side over 20,000 symbols",
         20,
         [](const complex* s, complex noise, std::uint64_t k, std::mt19937_64&) {
             return *s * std::pow(10, std::sin(static_cast<double>(k) / 3183) / 20) + noise;
         }},
        {{"gaussian"},
         "one symbol in a hundred hit ten times as hard",
         20,
         [](const complex* s, complex noise, std::uint64_t, std::mt19937_64& random) {
             return *s + noise * (random() % 100 == 0 ? std::sqrt(10.0) : 1.0);
         }},
        {{"white"},
         "noise that goes with a quarter of the noise before",
         20,
         [last = complex{}](const complex* s, complex noise, std::uint64_t, std::mt19937_64&) mutable {
             const complex now = *s + noise + 0.25 * last;
             last = noise;
             return now;
         }},
    };
    const auto set = named_set("qam:16");
    for (const auto& f : faults) {
        const auto all = premises_of(set, 100000, f.es_n0_db, 5, f.receive);
        std::string names;
        for (const auto& one : all)
            if (one.state == premise_state::fails)
                names += std::string(" ") + one.name + " (" + std::to_string(*one.effect_db) + " dB)";
        std::cout << f.what << ":" << names << '\n';
        EXPECT_EQ(failing(all), f.named) << f.what;
    }
}

TEST(Premises, EffectIsThePowerOverTheNoise)
{
    // An echo of the noise's own power at 20 dB: P/N0 = 1, 3.01 dB. 12,800 symbols: standard error of P/N0
    // √(2/n)·… < 0.02.
    const auto set = named_set("qam:16");
    const auto all =
        premises_of(set, 100000, 20, 6, [](const complex* s, complex noise, std::uint64_t, std::mt19937_64&) {
            return *s + 0.1 * s[-3] + noise;
        });
    ASSERT_STREQ(all[0].name, "no_memory");
    EXPECT_NEAR(*all[0].effect_db, 3.01, 0.15);
    EXPECT_TRUE(fails(all, "no_memory"));
}

TEST(Premises, ASmallEffectIsNoFailure)
{
    // An image 27.5 dB below the noise is significant over 1e7 symbols, and of no account.
    const auto set = named_set("psk:4");
    const double small = std::pow(10, -27.5 / 20) * 0.1; // P/N0 = 1.8e-3: 0.008 dB
    const auto all = premises_of(
        set, 1000000, 20, 7, [&](const complex* s, complex noise, std::uint64_t, std::mt19937_64&) {
            return *s + small * std::conj(*s) + noise;
        });
    for (const auto& one : all)
        if (std::string(one.name) == "no_image") {
            EXPECT_LT(*one.p, premise_significance);
            EXPECT_LT(*one.effect_db, premise_effect_db);
            EXPECT_EQ(one.state, premise_state::holds);
        }
}

TEST(Premises, TooFewSymbols)
{
    const auto set = named_set("qam:16");
    const auto all = premises_of(set, 20000, 20, 8, clean);
    ASSERT_EQ(all.size(), 8u);
    for (const auto& one : all) {
        EXPECT_EQ(one.state, premise_state::too_few);
        EXPECT_FALSE(one.p || one.effect_db);
        EXPECT_STREQ(to_string(one.state), "too_few");
    }
    EXPECT_TRUE(find_premises({}).empty());
}
