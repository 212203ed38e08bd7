// SPDX-License-Identifier: GPL-3.0-or-later
// rates: the rungs against textbook closed forms, their order, their inverse, and what is refused.
#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <random>

using namespace halfplane;

namespace {

double q_function(double x)
{
    return 0.5 * std::erfc(x / std::sqrt(2.0));
}

signal_set random_set(std::size_t m, std::mt19937& draw)
{
    std::normal_distribution<double> normal;
    std::vector<complex> points;
    for (std::size_t i = 0; i < m; ++i)
        points.emplace_back(normal(draw), normal(draw));
    return signal_set::with_natural_labels(std::move(points));
}

std::string refusal(double es_n0)
{
    const predictor two(signal_set::with_natural_labels({{1, 0}, {-1, 0}}));
    try {
        two.at(es_n0);
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(Rates, TwoPointsMakeAllRungsEqual)
{
    const predictor two(signal_set::with_natural_labels({{1, 0}, {-1, 0}}));
    for (double db = -10; db <= 25; db += 0.5) {
        const double expected = q_function(std::sqrt(2 * from_db(db)));
        const auto r = two.at(from_db(db));
        for (const double p : {r.exact.ser,
                               r.exact.ber,
                               r.facing.ser,
                               r.union_bound.ser,
                               r.nearest.ser,
                               r.exact.ser_by_point[0],
                               r.exact.ser_by_point[1],
                               r.exact.ber_by_bit[0]})
            EXPECT_NEAR(p / expected, 1, 1e-11) << db << " dB";
        EXPECT_NEAR(r.exact.ln_ser, std::log(expected), 1e-11 * (1 + std::abs(std::log(expected))));
    }
}

TEST(Rates, ExactThenFacingThenUnionOnRandomSets)
{
    std::mt19937 draw(20261201);
    std::uniform_int_distribution<std::size_t> size(2, 40);
    std::uniform_real_distribution<double> level(-5, 25);
    for (int k = 0; k < 200; ++k) {
        const predictor p(random_set(size(draw), draw));
        const auto r = p.at(from_db(level(draw)));
        const double slack = 1 + 1e-12;
        EXPECT_LE(r.exact.ser, r.facing.ser * slack) << "set " << k;
        EXPECT_LE(r.facing.ser, r.union_bound.ser * slack) << "set " << k;
        EXPECT_GT(r.exact.ser, 0);
    }
}

TEST(Rates, TransitionRowsSumToOneAndAgreeWithSerAndBer)
{
    std::mt19937 draw(7);
    const auto set = random_set(23, draw);
    const predictor p(set);
    for (const double db : {-5.0, 5.0, 15.0}) {
        const auto r = p.at(from_db(db));
        double ber = 0;
        for (std::size_t i = 0; i < set.size(); ++i) {
            const auto row = p.transition_row(from_db(db), i);
            double sum = 0, wrong = 0;
            for (std::size_t j = 0; j < row.size(); ++j) {
                sum += row[j];
                wrong += j == i ? 0 : row[j];
                ber += row[j] * label_distance(set.labels()[i], set.labels()[j]);
            }
            EXPECT_NEAR(sum, 1, 1e-13);
            EXPECT_NEAR(wrong / r.exact.ser_by_point[i], 1, 1e-11);
        }
        EXPECT_NEAR(ber / set.size() / set.label_bits() / r.exact.ber, 1, 1e-11) << db << " dB";
    }
}

TEST(Rates, TheInverseInverts)
{
    std::mt19937 draw(11);
    const predictor p(random_set(12, draw));
    for (const auto r : {rung_name::exact, rung_name::facing, rung_name::union_bound, rung_name::nearest})
        for (const double target : {0.02, 1e-2, 1e-6, 1e-40, 1e-200}) {
            EXPECT_NEAR(p.ser(*p.es_n0_for_ser(target, r), r) / target, 1, 1e-9) << to_string(r) << target;
            EXPECT_NEAR(p.ber(*p.es_n0_for_ber(target, r), r) / target, 1, 1e-9) << to_string(r) << target;
        }
    EXPECT_FALSE(p.es_n0_for_ser(0.999)) << "more than even -60 dB gives";
}

TEST(Rates, RefusesWhatIsNoRatio)
{
    EXPECT_EQ(refusal(0), "Es/N0 must be a finite ratio above 0, got 0");
    EXPECT_EQ(refusal(-1.5), "Es/N0 must be a finite ratio above 0, got -1.5");
    EXPECT_EQ(refusal(std::numeric_limits<double>::quiet_NaN()),
              "Es/N0 must be a finite ratio above 0, got nan");
    EXPECT_EQ(refusal(std::numeric_limits<double>::infinity()),
              "Es/N0 must be a finite ratio above 0, got inf");
}
