// SPDX-License-Identifier: GPL-3.0-or-later
// rate_identities: what must not change when a set is turned, moved, scaled or relabelled; the edges of the
// domain.
#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <random>

using namespace halfplane;

namespace {

signal_set random_set(std::size_t m, unsigned seed, bool unequal)
{
    std::mt19937 draw(seed);
    std::normal_distribution<double> normal;
    std::uniform_real_distribution<double> weight(0.2, 1);
    std::vector<complex> points;
    std::vector<label_t> labels;
    std::vector<double> priors;
    double sum = 0;
    for (std::size_t i = 0; i < m; ++i) {
        points.emplace_back(normal(draw), normal(draw));
        labels.push_back(static_cast<label_t>(i));
        sum += (priors.push_back(weight(draw)), priors.back());
    }
    for (double& p : priors)
        p /= sum;
    std::shuffle(labels.begin(), labels.end(), draw);
    return {points, labels, 5, unequal ? priors : std::vector<double>{}};
}

/// es_n0 that gives `set` the noise that `n0` is.
double es_n0_of(const signal_set& set, double n0)
{
    return set.es() / n0;
}

void expect_same(const rates& a, const rates& b, double bound, const std::string& what)
{
    EXPECT_NEAR(a.exact.ser / b.exact.ser, 1, bound) << what;
    EXPECT_NEAR(a.exact.ber / b.exact.ber, 1, bound) << what;
    EXPECT_NEAR(a.facing.ser / b.facing.ser, 1, bound) << what;
    EXPECT_NEAR(a.union_bound.ber / b.union_bound.ber, 1, bound) << what;
    EXPECT_NEAR(a.nearest.ser / b.nearest.ser, 1, bound) << what;
    for (std::size_t i = 0; i < a.exact.ser_by_point.size(); ++i)
        EXPECT_NEAR(a.exact.ser_by_point[i] / b.exact.ser_by_point[i], 1, bound) << what << " point " << i;
}

} // namespace

TEST(RateIdentities, RotationMirrorScaleAndTranslationLeaveRatesAlone)
{
    for (const bool unequal : {false, true})
        for (const char* law : {"awgn", "rician:4"}) {
            if (unequal && std::string(law) != "awgn")
                continue; // the quadrature over the fade has its own test
            const auto set = random_set(11, 5, unequal);
            const auto channel = parse_law(law);
            for (const double db : {0.0, 12.0, 22.0}) {
                const double n0 = set.es() / from_db(db);
                const auto plain = predictor(set, channel).at(es_n0_of(set, n0));
                const auto check =
                    [&](const signal_set& other, double factor, double bound, const char* what) {
                        expect_same(predictor(other, channel).at(es_n0_of(other, n0 * factor * factor)),
                                    plain,
                                    bound,
                                    what);
                    };
                check(set.scaled(std::polar(1.0, 0.7)), 1, 1e-11, "rotation");
                check(set.scaled(-3.7), 3.7, 1e-11, "scale and half a turn");
                check(set.scaled(1e150), 1e150, 1e-11, "coordinates near 1e150");
                check(set.scaled(1e-150), 1e-150, 1e-11, "coordinates near 1e-150");
                check(set.translated({0.3, -2}), 1, 1e-11, "translation");
                check(set.translated({1e4, 3e3}), 1, 1e-8, "far translation, coordinates rounded at 1e-12");
                std::vector<complex> mirrored;
                for (const auto& p : set.points())
                    mirrored.push_back(std::conj(p));
                check({mirrored, set.labels(), 5, unequal ? set.priors() : std::vector<double>{}},
                      1,
                      1e-11,
                      "mirror");
            }
        }
}

TEST(RateIdentities, RelabellingLeavesSerAloneAndBitsAverageToBer)
{
    const auto set = random_set(13, 8, false);
    auto labels = set.labels();
    std::reverse(labels.begin(), labels.end());
    const auto a = predictor(set).at(10), b = predictor(set.relabelled(labels)).at(10);
    EXPECT_NEAR(a.exact.ser / b.exact.ser, 1, 1e-14);
    EXPECT_NE(a.exact.ber, b.exact.ber);
    double mean = 0;
    for (const double p : a.exact.ber_by_bit)
        mean += p / 5;
    EXPECT_NEAR(a.exact.ber / mean, 1, 1e-14);
    EXPECT_DOUBLE_EQ(a.exact.ber_if_gray, a.exact.ser / 5);
}

TEST(RateIdentities, UnequallyProtectedBitsKeepTheirDigits)
{
    // Two tight pairs far apart: the left bit is Q-function small beside the right one, by products of two
    // lines.
    const double near = 0.1, far = 2;
    const signal_set set(
        {{-far - near, 0}, {-far + near, 0}, {far - near, 0}, {far + near, 0}}, {0, 1, 3, 2}, 2);
    const double n0 = 0.1, s = std::sqrt(n0 / 2);
    const auto q = [](double x) { return 0.5 * std::erfc(x / std::sqrt(2.0)); };
    const auto r = predictor(set).at(set.es() / n0).exact;
    const double left = 0.5 * (q((far + near) / s) + q((far - near) / s));
    EXPECT_NEAR(r.ber_by_bit[0] / left, 1, 1e-12) << left;
    EXPECT_GT(r.ber_by_bit[1] / r.ber_by_bit[0], 1e10);
}

TEST(RateIdentities, DisplacedByNothingIsUndisplaced)
{
    for (const bool unequal : {false, true}) {
        const auto set = random_set(9, 21, unequal);
        const predictor p(set);
        for (const double db : {-3.0, 10.0, 25.0}) {
            const auto a = p.at(from_db(db)).exact, b = p.displaced(from_db(db), set.points());
            EXPECT_NEAR(a.ser / b.ser, 1, 1e-12);
            EXPECT_NEAR(a.ber / b.ber, 1, 1e-12);
            EXPECT_NEAR(a.ln_ser - b.ln_ser, 0, 1e-9);
        }
    }
}

TEST(RateIdentities, MeansOnBordersAndCorners)
{
    // Four points; a mean at the common corner of all cells is right in a quarter of all cases, whatever the
    // noise.
    const auto four = signal_set::with_natural_labels({{1, 1}, {-1, 1}, {-1, -1}, {1, -1}});
    const predictor p(four);
    for (const double db : {-10.0, 10.0, 60.0}) {
        const auto corner = p.displaced(from_db(db), std::vector<complex>(4, complex{0, 0}));
        for (const double x : corner.ser_by_point)
            EXPECT_NEAR(x, 0.75, 1e-7) << db;
    }
    const auto border = p.displaced(from_db(20), {{0, 9}, {0, 9}, {0, -9}, {0, -9}});
    EXPECT_NEAR(border.ser, 0.5, 1e-9);
    const auto swapped = p.displaced(from_db(20), {{-1, 1}, {1, 1}, {-1, -1}, {1, -1}});
    EXPECT_NEAR(swapped.ser_by_point[0], 1, 1e-9) << "an arrival in another point's cell";
    EXPECT_NEAR(swapped.ser_by_point[2], p.at(from_db(20)).exact.ser, 1e-12);
}

TEST(RateIdentities, NoiseShapes)
{
    const auto set = random_set(8, 4, false);
    const auto plain = predictor(set).at(20);
    const auto circular = predictor(set, std::make_shared<awgn>(), detector::automatic, {2.5, 0, 2.5}).at(20);
    EXPECT_DOUBLE_EQ(plain.exact.ser, circular.exact.ser);
    // One dimension alone: two points on the i axis feel the noise of that axis, (1/4) of 1 + 3.
    const auto two = signal_set::with_natural_labels({{-1, 0}, {1, 0}});
    for (const auto m : {metric::matched, metric::nearest}) {
        const predictor p(two, std::make_shared<awgn>(), detector::automatic, {1, 0, 3, m});
        const double expected = 0.5 * std::erfc(std::sqrt(2 * 6.0));
        const auto r = p.at(6);
        EXPECT_NEAR(r.exact.ser / expected, 1, 1e-12);
        EXPECT_NEAR(r.union_bound.ser / expected, 1, 1e-12);
        EXPECT_NEAR(r.facing.ser / expected, 1, 1e-12);
    }
    for (const noise_shape bad : {noise_shape{0, 0, 1},
                                  noise_shape{1, 1, 1},
                                  noise_shape{-1, 0, -1},
                                  noise_shape{1, std::nan(""), 1}})
        EXPECT_THROW(predictor(set, std::make_shared<awgn>(), detector::automatic, bad),
                     std::invalid_argument);
}

TEST(RateIdentities, ConfusionCountsAddUp)
{
    const auto set = random_set(6, 2, false);
    const predictor p(set);
    const auto counts = p.expected_counts(4, {10, 20, 30, 40, 50, 60});
    for (std::size_t i = 0; i < 6; ++i) {
        double sum = 0;
        for (std::size_t j = 0; j < 6; ++j)
            sum += counts[i * 6 + j];
        EXPECT_NEAR(sum, 10.0 * (i + 1), 1e-11);
    }
    EXPECT_THROW(p.expected_counts(4, {1, 2}), std::invalid_argument);
}

TEST(RateIdentities, SlopeIsTheDerivative)
{
    // Two points: d ln Q(x)/d ln γ = −x φ(x)/(2 Q(x)), x = √(2γ).
    const predictor two(signal_set::with_natural_labels({{1, 0}, {-1, 0}}));
    for (const double db : {-5.0, 5.0, 12.0, 20.0}) {
        const double x = std::sqrt(2 * from_db(db));
        const double phi = std::exp(-x * x / 2) / std::sqrt(2 * M_PI),
                     q = 0.5 * std::erfc(x / std::sqrt(2.0));
        const double expected = -x * phi / (2 * q) / 10;
        EXPECT_NEAR(two.ser_decades_per_db(from_db(db)) / expected, 1, 1e-8) << db;
        EXPECT_NEAR(two.ber_decades_per_db(from_db(db)) / expected, 1, 1e-8) << db;
    }
    EXPECT_THROW(two.ser_decades_per_db(0), std::invalid_argument);
}

TEST(RateIdentities, CollinearPointsAreALine)
{
    // 8 levels on a tilted line, as 8-PAM: SER = 2(1 − 1/8)·Q(√(6γ/63)), Proakis 4th ed. eq. 5.2-46.
    std::vector<complex> points;
    for (int k = 0; k < 8; ++k)
        points.push_back(std::polar(2.0 * k - 7, 0.3));
    const predictor p(signal_set::with_natural_labels(points));
    for (const double db : {0.0, 15.0, 25.0})
        EXPECT_NEAR(p.ser(from_db(db)) / (1.75 * 0.5 * std::erfc(std::sqrt(3 * from_db(db) / 63))), 1, 1e-11)
            << db;
    EXPECT_EQ(p.facing(1, 3), (std::vector<std::size_t>{2, 4}));
}

TEST(RateIdentities, CellsThatMeetInOnePointDoNotFace)
{
    for (int turn = 0; turn < 20; ++turn) {
        std::vector<complex> points;
        for (int q = 0; q < 32; ++q)
            for (int i = 0; i < 32; ++i)
                points.push_back((complex(i, q) + complex(1e3 * turn, 0)) *
                                 std::polar(std::pow(1.7, turn), 0.31 * turn));
        const predictor p(signal_set::with_natural_labels(points));
        std::size_t pairs = 0;
        for (std::size_t i = 0; i < points.size(); ++i)
            pairs += p.facing(1, i).size();
        EXPECT_EQ(pairs, 4u * 32 * 31) << "turn " << turn;
    }
}

TEST(RateIdentities, RefusesBadArguments)
{
    const auto set = random_set(4, 1, false);
    const predictor p(set);
    constexpr double inf = std::numeric_limits<double>::infinity();
    EXPECT_THROW(p.transition_row(1, 4), std::out_of_range);
    EXPECT_THROW(p.facing(1, 4), std::out_of_range);
    EXPECT_THROW(p.facing(-1, 0), std::invalid_argument);
    for (const double target : {0.0, -1.0, inf, std::nan("")})
        EXPECT_THROW(p.es_n0_for_ser(target), std::invalid_argument);
    EXPECT_FALSE(predictor(set, parse_law("rayleigh")).es_n0_for_ser(1e-30)) << "beyond 200 dB";
    EXPECT_TRUE(predictor(set, parse_law("rayleigh")).es_n0_for_ser(1e-12));
    EXPECT_THROW(p.displaced(1, std::vector<complex>(3)), std::invalid_argument);
    EXPECT_THROW(p.displaced(1, {{0, 0}, {0, 1}, {inf, 0}, {0, 0}}), std::invalid_argument);
    EXPECT_THROW(p.displaced_among(1, std::vector<displaced_point>{{0, {0, 0}, 0.5}}), std::invalid_argument);
    EXPECT_THROW(p.displaced_among(1, std::vector<displaced_point>{{9, {0, 0}, 1}}), std::out_of_range);
    EXPECT_THROW(parse_detector("mpa"), std::invalid_argument);
    EXPECT_THROW(parse_rung("tight"), std::invalid_argument);
    EXPECT_EQ(parse_rung("union"), rung_name::union_bound);
}
