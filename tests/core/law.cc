// SPDX-License-Identifier: GPL-3.0-or-later
// law: tails and densities against each other, limits towards AWGN, mixtures, and every refusal.
#include "halfplane/law.h"
#include "halfplane/rates.h"
#include "halfplane/wedge.h"

#include <boost/math/quadrature/gauss_kronrod.hpp>
#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>

using namespace halfplane;

namespace {

std::string refusal(const std::string& text)
{
    try {
        parse_law(text);
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

signal_set ring_and_centre()
{
    return signal_set::with_natural_labels({{0, 0}, {1, 0}, {0, 1}, {-1, 0}, {0, -1}});
}

/// A user's own law in a few lines, as DEVELOPERS.md shows it: shadowing between two levels, no states told.
class two_levels final : public law
{
public:
    std::string name() const override { return "two levels"; }
    double tail(double u) const override { return 0.5 * std::exp(-0.4 * u) + 0.5 * std::exp(-1.6 * u); }
};

} // namespace

TEST(Law, TailIsTheTransformOfTheDensity)
{
    // T(u) = ∫ f(g)·exp(−g·u) dg by Boost's Gauss–Kronrod rule in ln g, for L branches T^L.
    double worst = 0;
    for (const char* text : {"rayleigh",
                             "nakagami:0.5",
                             "nakagami:3.3",
                             "nakagami:80",
                             "rician:-20",
                             "rician:3",
                             "rician:15",
                             "rician:24"})
        for (const unsigned branches : {1u, 2u, 5u}) {
            const auto channel = parse_law(text);
            for (const double u : {0.0, 0.3, 2.0, 20.0}) {
                double sum = 0;
                for (double s = -100; s < 5; s += 0.25)
                    sum += boost::math::quadrature::gauss_kronrod<double, 31>::integrate(
                        [&](double x) {
                            const double g = std::exp(x);
                            return g * channel->density(g, branches) * std::exp(-g * u);
                        },
                        s,
                        s + 0.25,
                        3,
                        1e-12);
                const double error = std::abs(sum / std::pow(channel->tail(u), branches) - 1);
                EXPECT_LE(error, 2e-10) << text << " " << branches << " branches at " << u;
                worst = std::max(worst, error);
            }
        }
    std::printf("density against tail: worst relative error %.1e\n", worst);
}

TEST(Law, EveryLawAtItsAwgnLimit)
{
    // Rician at K = 1e10 and Nakagami at m = 1e9 differ from AWGN by terms of order E²/K and E²/(2m), E = ln
    // 1/P.
    const predictor plain(ring_and_centre());
    for (const char* text : {"rician:100", "nakagami:1e9", "impulsive:100:1e9", "awgn*1"})
        for (const double db : {-10.0, 3.0, 12.0}) {
            const double expected = plain.ser(from_db(db));
            EXPECT_NEAR(predictor(ring_and_centre(), parse_law(text)).ser(from_db(db)) / expected, 1, 1e-5)
                << text << " at " << db << " dB";
        }
    EXPECT_NEAR(
        predictor(ring_and_centre(), std::make_shared<mixture>(std::vector<channel_state>{{1, 1}})).ser(7) /
            plain.ser(7),
        1,
        1e-14);
}

TEST(Law, SpecialCasesAgree)
{
    for (const double db : {-5.0, 10.0, 40.0}) {
        const double g = from_db(db);
        const auto ser = [&](const std::string& text) {
            return predictor(ring_and_centre(), parse_law(text)).ser(g);
        };
        EXPECT_NEAR(ser("nakagami:1") / ser("rayleigh"), 1, 1e-13);
        EXPECT_NEAR(ser("rician:-100") / ser("rayleigh"), 1, 1e-9);
        EXPECT_NEAR(ser("rayleigh*1") / ser("rayleigh"), 1, 1e-13);
        // L Rayleigh branches are Nakagami with m = L at L times the mean.
        EXPECT_NEAR(
            ser("rayleigh*4") / predictor(ring_and_centre(), parse_law("nakagami:4")).ser(4 * g), 1, 1e-12);
        const double thrice = predictor(ring_and_centre()).ln_ser(3 * g);
        EXPECT_NEAR(predictor(ring_and_centre(), parse_law("awgn*3")).ln_ser(g) / thrice, 1, 1e-12);
    }
}

TEST(Law, AUsersLawWithAndWithoutStates)
{
    const predictor by_tail(ring_and_centre(), std::make_shared<two_levels>());
    const predictor by_states(
        ring_and_centre(),
        std::make_shared<mixture>(std::vector<channel_state>{{0.5, 0.4}, {0.5, 1.6}}, "mine"));
    EXPECT_EQ(by_states.channel().name(), "mine");
    for (const double db : {-10.0, 5.0, 20.0, 30.0}) {
        const auto a = by_tail.at(from_db(db)), b = by_states.at(from_db(db));
        EXPECT_NEAR(a.exact.ser / b.exact.ser, 1, fading_rate_accuracy) << db;
        EXPECT_NEAR(a.exact.ber / b.exact.ber, 1, fading_rate_accuracy) << db;
        EXPECT_NEAR(a.union_bound.ser / b.union_bound.ser, 1, fading_rate_accuracy) << db;
    }
    const auto unequal = ring_and_centre().with_priors({0.2, 0.1, 0.3, 0.2, 0.2});
    EXPECT_GT(
        predictor(unequal, std::make_shared<mixture>(std::vector<channel_state>{{0.5, 0.4}, {0.5, 1.6}}))
            .ser(5),
        0);
    EXPECT_THROW(predictor(unequal, std::make_shared<two_levels>()).ser(5), std::logic_error) << "no density";
}

TEST(Law, DiversityOfMixturesAddsGains)
{
    const auto branch = std::make_shared<mixture>(std::vector<channel_state>{{0.25, 0.1}, {0.75, 1.3}});
    const diversity both(branch, 2);
    ASSERT_EQ(both.states().size(), 3u);
    for (const double u : {0.0, 1.0, 30.0})
        EXPECT_NEAR(both.tail(u) / (branch->tail(u) * branch->tail(u)), 1, 1e-14);
}

TEST(Law, FarTailsStayNumbers)
{
    const auto r = predictor(ring_and_centre(), parse_law("rician:60")).at(from_db(40)).exact;
    EXPECT_EQ(r.ser, 0);
    EXPECT_TRUE(std::isfinite(r.ln_ser)) << r.ln_ser;
    EXPECT_LT(r.ln_ser, -2000);
}

TEST(Law, RefusesWhatItDoesNotUnderstand)
{
    EXPECT_EQ(refusal("rayleight"),
              "no channel law is called 'rayleight': write awgn, rayleigh, rician:K_DB, "
              "nakagami:M or impulsive:A:GAMMA");
    EXPECT_EQ(refusal("rician"), "the channel law 'rician' is to be written rician:K_DB");
    EXPECT_EQ(refusal("awgn:1"), "the channel law 'awgn:1' is to be written awgn");
    EXPECT_EQ(refusal("rician:6dB"), "'6dB' in the channel law 'rician:6dB' is not a number");
    EXPECT_EQ(refusal("rician:nan"), "K of the Rician law must lie between -100 and 100 dB, got nan");
    EXPECT_EQ(refusal("rician:101"), "K of the Rician law must lie between -100 and 100 dB, got 101");
    EXPECT_EQ(refusal("nakagami:0.49"), "m of the Nakagami law must lie between 0.5 and 1e9, got 0.49");
    EXPECT_EQ(refusal("nakagami:inf"), "m of the Nakagami law must lie between 0.5 and 1e9, got inf");
    EXPECT_EQ(refusal("impulsive:0:1"),
              "A of the impulsive law must lie between 1e-4 and 100 and GAMMA between 1e-9 "
              "and 1e9, got impulsive:0:1");
    for (const char* text : {"rayleigh*0", "rayleigh*65", "rayleigh*2.5", "rayleigh*2*2", "rayleigh*-1"})
        EXPECT_EQ(refusal(text),
                  std::string("the channel law '") + text +
                      "' needs one whole number of branches from 1 to 64 after '*'");
    EXPECT_NE(refusal("impulsive:0.1:0.1*2").find("cannot be combined"), std::string::npos);
    EXPECT_THROW(mixture({{0.5, 1}}), std::invalid_argument) << "probabilities that sum to 0.5";
    EXPECT_THROW(mixture({{0.5, 1}, {0.5, 0}}), std::invalid_argument) << "a gain of 0";
    EXPECT_THROW(mixture({{1.5, 1}, {-0.5, 1}}), std::invalid_argument);
    EXPECT_THROW(mixture({}), std::invalid_argument);
    EXPECT_THROW(predictor(ring_and_centre(), nullptr), std::invalid_argument);
}
