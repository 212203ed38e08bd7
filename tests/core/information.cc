// SPDX-License-Identifier: GPL-3.0-or-later
// information: against dense sums in mpmath, known limits, a second route, and what must not matter.
#include "halfplane/information.h"
#include "halfplane/set_file.h"

#include "tables/information.h"

#include <gtest/gtest.h>

#include <boost/math/quadrature/gauss_kronrod.hpp>

#include <cmath>
#include <cstdio>
#include <limits>
#include <random>
#include <string>

using namespace halfplane;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

double linear(double db)
{
    return std::pow(10, db / 10);
}

/// The sets of tables/information.py.
signal_set table_set(const std::string& name)
{
    if (name == "two")
        return named_set("psk:2");
    if (name == "psk8")
        return named_set("psk:8");
    if (name == "firn12")
        return load_set(HALFPLANE_SOURCE_DIR "/examples/sets/firn-12.json");
    if (name == "five")
        return {{{0, 0}, {3, 0}, {0, 2}, {-1, 0}, {0.5, -2.5}},
                {5, 0, 3, 6, 1},
                3,
                {6 / 16.0, 1 / 16.0, 2 / 16.0, 4 / 16.0, 3 / 16.0}};
    if (name == "qam4")
        return {
            {{-1, -1}, {1, -1}, {-1, 1}, {1, 1}}, {0, 2, 1, 3}, 2, {3 / 32.0, 9 / 32.0, 5 / 32.0, 15 / 32.0}};
    throw std::logic_error(name);
}

/// I(X;Y) of two equally likely points ±√γ in real noise N(0, 1/2), from its textbook integral.
double two_point_information(double gamma)
{
    const auto loss = [&](double t) { // y = √γ + t/√2
        const double l = 4 * std::sqrt(gamma) * (std::sqrt(gamma) + t / std::sqrt(2.0));
        const double softplus = l > 0 ? std::log1p(std::exp(-l)) : -l + std::log1p(std::exp(l));
        return std::exp(-t * t / 2) / std::sqrt(2 * std::acos(-1.0)) * softplus / std::log(2.0);
    };
    return 1 - boost::math::quadrature::gauss_kronrod<double, 61>::integrate(loss, -12.0, 12.0, 15, 1e-13);
}

signal_set random_set(std::size_t m, std::uint64_t seed, bool priors)
{
    std::mt19937_64 next(seed);
    std::normal_distribution<double> normal;
    std::vector<complex> points(m);
    std::vector<double> p(m);
    double sum = 0;
    for (std::size_t k = 0; k < m; ++k) {
        points[k] = {normal(next), normal(next)};
        sum += p[k] = 0.1 + std::abs(normal(next));
    }
    for (double& value : p)
        value /= sum;
    const auto set = signal_set::with_natural_labels(points);
    return priors ? set.with_priors(p) : set;
}

} // namespace

TEST(Information, AgreesWithDenseSumsInMpmath)
{
    double worst = 0;
    for (const auto& row : information_rows) {
        const auto got = information_at(table_set(row.set), linear(row.es_n0_db));
        worst = std::max({worst, std::abs(got.mi - row.mi), std::abs(got.bmd_rate - row.bmd_rate)});
        EXPECT_NEAR(got.mi, row.mi, information_accuracy) << row.set << " at " << row.es_n0_db;
        EXPECT_NEAR(got.bmd_rate, row.bmd_rate, information_accuracy) << row.set << " at " << row.es_n0_db;
    }
    std::printf("mpmath: worst error %.2g bit\n", worst);
}

TEST(Information, TwoPointsFromTheTextbookIntegral)
{
    double worst = 0;
    for (double db = -40; db <= 20; db += 0.5) {
        const double expected = two_point_information(linear(db));
        for (const auto& set : {named_set("psk:2"), named_set("psk:2").scaled(std::polar(3.0, 0.6))})
            worst = std::max(worst, std::abs(information_at(set, linear(db)).mi - expected));
    }
    std::printf("two points: worst error %.2g bit\n", worst);
    EXPECT_LT(worst, information_accuracy);
}

TEST(Information, RateOneHalfNeedsThePublishedEbN0)
{
    // Binary-input AWGN at rate 1/2: Eb/N0 = 0.187 dB (Richardson and Urbanke, Modern Coding Theory, from
    // memory). Eb of half a bit a symbol: Es/N0 less 10·log10(1/2).
    const double es_n0 = *es_n0_for_information(named_set("psk:2"), 0.5);
    EXPECT_NEAR(10 * std::log10(es_n0 / 0.5), 0.187, 5e-4);
}

TEST(Information, AxisByAxisEqualsThePlane)
{
    // A turned grid is no product of its axes, so it takes the other way.
    double worst = 0;
    const auto shaped = [] {
        const double p[4] = {0.1, 0.4, 0.3, 0.2};
        std::vector<double> priors;
        for (double row : p)
            for (double column : p)
                priors.push_back(row * column);
        return named_set("qam:16").with_priors(priors);
    }();
    for (const auto& set :
         {named_set("qam:4"), named_set("qam:8"), named_set("qam:16"), named_set("qam:64"), shaped})
        for (double db = -15; db <= 35; db += 2.5) {
            const auto a = information_at(set, linear(db));
            const auto b = information_at(
                set.scaled(std::polar(0.01, 0.5)).translated({3, 1}).translated({-3, -1}), linear(db));
            worst = std::max({worst, std::abs(a.mi - b.mi), std::abs(a.bmd_rate - b.bmd_rate)});
        }
    std::printf("axes against plane: worst difference %.2g bit\n", worst);
    EXPECT_LT(worst, information_accuracy);
}

TEST(Information, ScaleTurnAndMirrorDoNotMatterLabelsDoNotMatterToMi)
{
    double worst = 0;
    std::mt19937_64 next(1);
    for (std::size_t m : {3u, 7u, 33u})
        for (bool priors : {false, true})
            for (double db : {-10.0, 3.0, 9.0, 15.0, 22.0}) {
                const auto set = random_set(m, m, priors);
                const auto a = information_at(set, linear(db));
                const auto b = information_at(set.scaled(std::polar(1e100, 2.0)), linear(db));
                auto points = set.points();
                for (auto& p : points)
                    p = std::conj(p) * 1e-100;
                const signal_set mirrored(
                    points, set.labels(), set.label_bits(), priors ? set.priors() : std::vector<double>{});
                const auto c = information_at(mirrored, linear(db));
                auto labels = set.labels();
                std::shuffle(labels.begin(), labels.end(), next);
                const auto d = information_at(set.relabelled(labels), linear(db));
                worst = std::max({worst,
                                  std::abs(a.mi - b.mi),
                                  std::abs(a.bmd_rate - b.bmd_rate),
                                  std::abs(a.mi - c.mi),
                                  std::abs(a.bmd_rate - c.bmd_rate),
                                  std::abs(a.mi - d.mi)});
            }
    std::printf("invariances: worst difference %.2g bit\n", worst);
    EXPECT_LT(worst, information_accuracy);
}

TEST(Information, LimitsAtBothEnds)
{
    for (const char* name : {"psk:2", "qam:16", "psk:8", "cross:32", "hex:19", "apsk:4+8:2.3"}) {
        const auto set = named_set(name);
        const double h = set.entropy_bits();
        EXPECT_EQ(information_at(set, 0).mi, 0);
        EXPECT_EQ(information_at(set, inf).mi, h);
        EXPECT_EQ(information_at(set, inf).bmd_rate, h);
        EXPECT_NEAR(information_at(set, linear(-200)).mi, 0, 1e-12);
        EXPECT_NEAR(information_at(set, linear(-200)).bmd_rate, information_at(set, 0).bmd_rate, 1e-12);
        EXPECT_EQ(information_at(set, linear(200)).mi, h);
        // To first order in Es/N0 every set without a mean carries as much as the channel can: γ·log2(e).
        EXPECT_NEAR(information_at(set, 1e-5).mi / (1e-5 / std::log(2.0)), 1, 1e-4) << name;
    }
    // All 2^b labels, equal priors: nothing at −∞ dB. Twelve of sixteen natural labels: Σ_k H(B_k) exceeds H
    // by hand: log2 12 − [H(1/3) + H(1/3) + 1 + 1].
    EXPECT_NEAR(information_at(named_set("qam:16"), 0).bmd_rate, 0, 1e-15);
    const double third = std::log2(3.0) - 2.0 / 3;
    EXPECT_NEAR(
        information_at(named_set("apsk:4+8:2.3"), 0).bmd_rate, std::log2(12.0) - (2 * third + 2), 1e-14);
}

TEST(Information, OrderedAsTheoryHasIt)
{
    for (const char* name : {"qam:16", "psk:8", "cross:32", "hex:16", "apsk:4+12:2.85"}) {
        const auto set = named_set(name);
        double last = 0;
        for (double db = -20; db <= 30; db += 1) {
            const auto i = information_at(set, linear(db));
            EXPECT_LE(i.bmd_rate, i.mi + information_accuracy) << name;
            EXPECT_LE(i.mi, capacity(linear(db)) + information_accuracy) << name;
            EXPECT_GE(i.mi, last - 1e-12) << name;
            last = i.mi;
        }
    }
    // One bit a dimension: label bits lose nothing.
    for (double db : {-3.0, 4.0, 9.0}) {
        const auto i = information_at(named_set("qam:4"), linear(db));
        EXPECT_NEAR(i.mi, i.bmd_rate, 1e-12);
        EXPECT_NEAR(i.mi, 2 * two_point_information(linear(db) / 2), information_accuracy);
    }
}

TEST(Information, InverseInverts)
{
    for (const char* name : {"psk:2", "qam:64", "psk:8"})
        for (double share : {0.01, 0.3, 0.5, 0.9, 0.999}) {
            const auto set = named_set(name);
            const double bits = share * set.entropy_bits();
            EXPECT_NEAR(information_at(set, *es_n0_for_information(set, bits)).mi, bits, 1e-9) << name;
        }
    EXPECT_FALSE(es_n0_for_information(named_set("qam:64"), 6));
    EXPECT_FALSE(es_n0_for_information(named_set("qam:64"), 7));
}

TEST(Information, CapacityAndGap)
{
    EXPECT_DOUBLE_EQ(capacity(3), 2);
    EXPECT_DOUBLE_EQ(es_n0_of_capacity(2), 3);
    EXPECT_NEAR(shannon_gap_db(named_set("qam:16"), 150), 10, 1e-12);      // 2^4 − 1 = 15
    EXPECT_NEAR(capacity_gap_db(30, 3), 10 * std::log10(30 / 7.0), 1e-12); // 2^3 − 1 = 7
    EXPECT_NEAR(capacity(es_n0_of_capacity(1e-12)), 1e-12, 1e-26);
}

TEST(Information, Refusals)
{
    const auto set = named_set("psk:4");
    EXPECT_THROW(information_at(set, -1), std::invalid_argument);
    EXPECT_THROW(information_at(set, NAN), std::invalid_argument);
    EXPECT_THROW(es_n0_for_information(set, 0), std::invalid_argument);
    EXPECT_THROW(capacity(-0.1), std::invalid_argument);
    EXPECT_THROW(es_n0_of_capacity(NAN), std::invalid_argument);
    EXPECT_THROW(shannon_gap_db(set, 0), std::invalid_argument);
    EXPECT_THROW(capacity_gap_db(1, 0), std::invalid_argument);
    EXPECT_THROW(capacity_gap_db(INFINITY, 1), std::invalid_argument);
}
