// SPDX-License-Identifier: GPL-3.0-or-later
// inverse: Es/N0 for a target on every rung, law and detector; what cannot be reached; the steepness of a
// curve.
#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <random>

using namespace halfplane;

namespace {

constexpr rung_name rungs[] = {
    rung_name::exact, rung_name::facing, rung_name::union_bound, rung_name::nearest};
const char* const laws[] = {"awgn",
                            "rayleigh",
                            "rician:6",
                            "rician:-3*2",
                            "nakagami:0.7",
                            "nakagami:3*3",
                            "rayleigh*4",
                            "impulsive:0.1:0.01",
                            "impulsive:1:0.5"};

signal_set five(std::vector<double> priors = {})
{
    return {{{1.1, 0.2}, {0.1, 0.9}, {-0.8, 0.7}, {-0.9, -0.8}, {0.6, -1.0}},
            {0, 1, 3, 2, 6},
            3,
            std::move(priors)};
}

struct curve {
    const predictor& p;
    bool bits;
    rung_name rung;
    double at(double es_n0) const { return bits ? p.ber(es_n0, rung) : p.ser(es_n0, rung); }
    double ln_at(double es_n0) const { return bits ? p.ln_ber(es_n0, rung) : p.ln_ser(es_n0, rung); }
    std::optional<double> back(double target) const
    {
        return bits ? p.es_n0_for_ber(target, rung) : p.es_n0_for_ser(target, rung);
    }
    double decades_per_db(double es_n0) const
    {
        return bits ? p.ber_decades_per_db(es_n0, rung) : p.ser_decades_per_db(es_n0, rung);
    }
};

/// f of every curve of the set under every law and rule that analysis knows.
template <typename F>
void for_all_curves(F f)
{
    for (const auto* law : laws)
        for (const bool shaped : {false, true}) {
            const auto set = shaped ? five({0.4, 0.25, 0.15, 0.1, 0.1}) : five();
            for (const auto rule : {detector::ml, detector::map}) {
                const auto channel = parse_law(law);
                if (shaped && rule == detector::map && !channel->map_refusal().empty())
                    continue; // refused, with its reason: see refusals of the predictor
                if (!shaped && rule == detector::map)
                    continue; // the same as nearest point
                // MAP under a continuous fade rebuilds its cells all along a quadrature: one law stands for
                // all.
                const bool quadrature = shaped && rule == detector::map && std::string(law) != "awgn";
                if (quadrature && std::string(law) != "rician:6")
                    continue;
                const predictor p(set, channel, rule);
                for (const auto rung : rungs)
                    for (const bool bits : {false, true}) {
                        if (quadrature && rung != rung_name::exact)
                            continue;
                        SCOPED_TRACE(std::string(law) + (shaped ? ", shaped" : "") +
                                     (rule == detector::map ? ", map, " : ", ml, ") + to_string(rung) +
                                     (bits ? " BER" : " SER"));
                        f(curve{p, bits, rung}, quadrature);
                    }
            }
        }
}

} // namespace

TEST(Inverse, InvertsOnEveryRungLawAndDetector)
{
    int cases = 0;
    for_all_curves([&](const curve& c, bool quadrature) {
        for (const double target : {0.01, 1e-3, 1e-6}) {
            if (quadrature && target != 1e-3)
                continue;
            const auto found = c.back(target);
            ASSERT_TRUE(found) << target;
            // MAP under a continuous fade is a quadrature of its own accuracy.
            EXPECT_NEAR(c.at(*found) / target, 1, quadrature ? 2 * map_fading_rate_accuracy : 1e-10)
                << target;
            for (const double beyond_db : {0.2, 1.0, 5.0})
                EXPECT_LE(c.at(*found * from_db(beyond_db)), target * (1 + 1e-9))
                    << target << " +" << beyond_db;
            ++cases;
        }
    });
    std::printf("%d inverses\n", cases);
    EXPECT_GT(cases, 300);
}

TEST(Inverse, SaysWhatCannotBeReached)
{
    const auto set = five();
    EXPECT_FALSE(predictor(set).es_n0_for_ser(0.99)) << "less is had even at -60 dB";
    EXPECT_FALSE(predictor(set, parse_law("rayleigh")).es_n0_for_ser(1e-25)) << "beyond 200 dB";
    // A point without a cell always errs: the floor of a MAP detector at low Es/N0, not at high.
    EXPECT_TRUE(predictor(five({0.996, 0.001, 0.001, 0.001, 0.001})).es_n0_for_ser(1e-6));
    // Where points arrive elsewhere the rate has a floor; the displaced rate is no curve to invert.
    EXPECT_TRUE(predictor(set, parse_law("rayleigh*4")).es_n0_for_ber(1e-25));
}

TEST(Inverse, TakesTheLastCrossingOfACurveThatComesBack)
{
    // MAP decisions make the fewest symbol errors, not the fewest bit errors: where the rare points carry
    // labels far from the frequent one's, their BER rises before it falls. Random sets until some curve does
    // so; then the answer must be the last crossing, as a scan in steps of 0.02 dB sees it.
    std::mt19937 draw(3);
    int seen = 0;
    for (int turn = 0; turn < 400 && seen < 3; ++turn) {
        std::normal_distribution<double> normal;
        std::vector<complex> points;
        std::vector<label_t> labels{0, 1, 2, 3, 4, 5, 6, 7};
        for (int k = 0; k < 5; ++k)
            points.emplace_back(normal(draw), normal(draw));
        std::shuffle(labels.begin(), labels.end(), draw);
        labels.resize(points.size());
        const predictor p(signal_set(points, labels, 3, {0.55, 0.2, 0.15, 0.06, 0.04}));
        double least = 1, highest_after = 0;
        for (double db = -25; db < 10; db += 0.5) {
            const double ber = p.ber(from_db(db));
            if (ber < least)
                least = ber, highest_after = 0;
            else
                highest_after = std::max(highest_after, ber);
            if (highest_after > 1.002 * least)
                break;
        }
        if (!(highest_after > 1.002 * least))
            continue;
        ++seen;
        const double target = std::sqrt(least * highest_after);
        double last = -60;
        for (double db = -30; db < 40; db += 0.02)
            if (p.ber(from_db(db)) > target)
                last = db;
        const auto found = p.es_n0_for_ber(target);
        ASSERT_TRUE(found);
        EXPECT_GE(to_db(*found), last - 1e-9);
        EXPECT_LE(to_db(*found), last + 0.02 + 1e-9);
    }
    EXPECT_EQ(seen, 3);
}

TEST(Inverse, SteepnessInClosedForm)
{
    const auto pair = named_set("psk:2");
    for (const double db : {-10.0, 0.0, 6.0, 12.0, 30.0}) {
        const double g = from_db(db);
        // Rayleigh: P = (1 − √(γ/(1+γ)))/2 (Proakis, Digital Communications, 4th ed. 2001, eq. 14.3-7); with
        // r = √(γ/(1+γ)), P = 1/(2(1+γ)(1+r)) and dP/dγ = −1/(4·√γ·(1+γ)^1.5).
        const double r = std::sqrt(g / (1 + g)), rate = 1 / (2 * (1 + g) * (1 + r));
        const double slope = -g / (4 * std::sqrt(g) * std::pow(1 + g, 1.5)) / rate / 10;
        const predictor p(pair, parse_law("rayleigh"));
        EXPECT_NEAR(p.ser(g) / rate, 1, 1e-12);
        EXPECT_NEAR(p.ser_decades_per_db(g) / slope, 1, 1e-8) << db;
        EXPECT_NEAR(p.ber_decades_per_db(g) / slope, 1, 1e-8) << db;
    }
}

TEST(Inverse, SteepnessIsTheDerivativeOnEveryRungLawAndDetector)
{
    double worst = 0;
    for_all_curves([&](const curve& c, bool quadrature) {
        if (quadrature)
            return; // accurate to 1e-8 only: a difference of it is no reference
        for (const double target : {0.03, 1e-5}) {
            const double db = to_db(*c.back(target)), h = 0.02;
            const auto ln = [&](double at) { return c.ln_at(from_db(at)); };
            // Five points: the error is of order h^4.
            const double slope =
                (8 * (ln(db + h) - ln(db - h)) - (ln(db + 2 * h) - ln(db - 2 * h))) / (12 * h) / std::log(10);
            const double error = std::abs(c.decades_per_db(from_db(db)) / slope - 1);
            worst = std::max(worst, error);
            EXPECT_LT(error, 1e-7) << target;
        }
    });
    std::printf("worst steepness: %.1e off five points\n", worst);
}
