// SPDX-License-Identifier: GPL-3.0-or-later
// map_rates: unequal priors against products of one-dimensional MAP detectors, empty cells, fading, refusals.
#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <boost/math/quadrature/gauss_kronrod.hpp>

#include <cmath>
#include <cstdio>
#include <random>

using namespace halfplane;

namespace {

double q_function(double x)
{
    return 0.5 * std::erfc(x / std::sqrt(2.0));
}

/*!
 * Error probability by point of MAP detection on a line (Proakis, Digital Communications, 4th ed. 2001,
 * section 5.1.3): the threshold between x_i and x_j lies at the middle shifted by N0 ln(p_i/p_j)/(2(x_j −
 * x_i)), and each point wins between its largest threshold below and its smallest above.
 */
std::vector<double> line_errors(const std::vector<double>& x, const std::vector<double>& p, double n0)
{
    std::vector<double> out;
    for (std::size_t i = 0; i < x.size(); ++i) {
        double low = -INFINITY, high = INFINITY;
        for (std::size_t j = 0; j < x.size(); ++j) {
            if (j == i)
                continue;
            const double threshold = 0.5 * (x[i] + x[j]) + n0 * std::log(p[i] / p[j]) / (2 * (x[j] - x[i]));
            (x[j] > x[i] ? high : low) = x[j] > x[i] ? std::min(high, threshold) : std::max(low, threshold);
        }
        const double s = std::sqrt(n0 / 2);
        out.push_back(low >= high ? 1 : q_function((high - x[i]) / s) + q_function((x[i] - low) / s));
    }
    return out;
}

const std::vector<double> positions{-7, -5, -3, -1, 1, 3, 5, 7};

/// Shaped 64-QAM: the product of two lines whose priors fall like exp(−v·x²).
signal_set shaped_64(double v, std::vector<double>& line_priors)
{
    double sum = 0;
    line_priors.clear();
    for (const double x : positions)
        sum += (line_priors.push_back(std::exp(-v * x * x)), line_priors.back());
    for (double& p : line_priors)
        p /= sum;
    std::vector<complex> points;
    std::vector<label_t> labels;
    std::vector<double> priors;
    for (std::size_t q = 0; q < 8; ++q)
        for (std::size_t i = 0; i < 8; ++i) {
            points.emplace_back(positions[i], positions[q]);
            labels.push_back(static_cast<label_t>(q << 3 | i));
            priors.push_back(line_priors[i] * line_priors[q]);
        }
    return {std::move(points), std::move(labels), 6, std::move(priors)};
}

} // namespace

TEST(MapRates, ShapedQamIsTheProductOfTwoLines)
{
    double worst = 0, smallest = 1;
    int empty = 0;
    for (const double v : {0.001, 0.02, 0.08, 0.3}) {
        std::vector<double> line;
        const auto set = shaped_64(v, line);
        const predictor p(set);
        ASSERT_EQ(p.rule(), detector::map);
        for (double db = -10; db < 45; db += 2.5) {
            const auto errors = line_errors(positions, line, set.es() / from_db(db));
            double expected = 0; // 1 − (1−a)(1−b) = a + b − a·b
            for (std::size_t q = 0; q < 8; ++q)
                for (std::size_t i = 0; i < 8; ++i)
                    expected += line[i] * line[q] * (errors[i] + errors[q] - errors[i] * errors[q]);
            if (expected < 1e-290)
                break;
            const auto r = p.at(from_db(db)).exact;
            const double error = std::abs(r.ser / expected - 1);
            EXPECT_LE(error, map_rate_accuracy) << "v " << v << " at " << db << " dB";
            worst = std::max(worst, error);
            smallest = std::min(smallest, expected);
            for (std::size_t i = 0; i < 8; ++i) {
                const double point = errors[i] + errors[0] - errors[i] * errors[0];
                EXPECT_NEAR(r.ser_by_point[i], point, 1e-12)
                    << "v " << v << " at " << db << " dB, point " << i;
                empty += errors[i] == 1;
            }
        }
    }
    std::printf("shaped 64-QAM: worst relative error %.1e down to %.0e, %d points without a cell\n",
                worst,
                smallest,
                empty);
    EXPECT_GT(empty, 0) << "the case of empty cells must occur";
}

TEST(MapRates, TwoPointsByTheHandbook)
{
    // p0·Q((d² + N0 ln(p0/p1))/(d√(2N0))) + the same with 0 and 1 exchanged; down to one prior of 1e-300.
    for (const double rare : {0.3, 1e-3, 1e-9, 1e-100, 1e-300}) {
        const signal_set two({{0, 0}, {0, 1}}, {0, 1}, 1, {1 - rare, rare});
        const predictor p(two);
        for (const double db : {-320.0, -40.0, -10.0, 0.0, 10.0, 20.0}) {
            if (db < -100)
                continue;
            // Es falls with the rare prior: state N0 instead.
            const double n0 = 1 / from_db(db), es_n0 = two.es() / n0, ln_odds = std::log((1 - rare) / rare);
            const double a = q_function((1 + n0 * ln_odds) / std::sqrt(2 * n0));
            const double b = q_function((1 - n0 * ln_odds) / std::sqrt(2 * n0));
            const double expected = (1 - rare) * a + rare * b;
            for (const auto r :
                 {rung_name::exact, rung_name::facing, rung_name::union_bound, rung_name::nearest})
                EXPECT_NEAR(p.ser(es_n0, r) / expected, 1, map_rate_accuracy)
                    << to_string(r) << rare << " " << db;
        }
    }
}

TEST(MapRates, APointWithoutACellFacesAllAndAlwaysErrs)
{
    const signal_set set({{-1, 0}, {0, 0}, {1, 0}}, {0, 1, 2}, 2, {0.495, 0.01, 0.495});
    const predictor p(set);
    const double low = from_db(-5);
    const auto r = p.at(low).exact;
    EXPECT_EQ(r.ser_by_point[1], 1);
    EXPECT_EQ(p.facing(low, 1), (std::vector<std::size_t>{0, 2}));
    EXPECT_EQ(p.facing(low, 0), (std::vector<std::size_t>{2}));
    const auto row = p.transition_row(low, 1);
    EXPECT_EQ(row[1], 0);
    EXPECT_NEAR(row[0], 0.5, 1e-14);
    EXPECT_NEAR(row[2], 0.5, 1e-14);
    EXPECT_EQ(p.facing(from_db(30), 0), (std::vector<std::size_t>{1}));
}

TEST(MapRates, AllButOnePriorTiny)
{
    // Three rare points round a frequent one: at low Es/N0 they have no cells, and the rate is what they are
    // sent.
    const double rare = 1e-12;
    const signal_set four(
        {{0, 0}, {1, 0}, {-0.5, 0.8}, {-0.5, -0.8}}, {0, 1, 2, 3}, 2, {1 - 3 * rare, rare, rare, rare});
    const auto r = predictor(four).at(four.es()).exact; // N0 = 1
    EXPECT_NEAR(r.ser / (3 * rare), 1, 1e-11);
    EXPECT_EQ(r.ser_by_point[1], 1);
    EXPECT_LT(r.ser_by_point[0], 1e-11);
}

TEST(MapRates, MapIsNeverWorseThanNearestPoint)
{
    std::mt19937 draw(3);
    std::exponential_distribution<double> weight;
    std::normal_distribution<double> normal;
    for (int k = 0; k < 50; ++k) {
        std::vector<complex> points;
        std::vector<label_t> labels;
        std::vector<double> priors;
        double sum = 0;
        for (label_t i = 0; i < 9; ++i) {
            points.emplace_back(normal(draw), normal(draw));
            labels.push_back(i);
            sum += (priors.push_back(weight(draw)), priors.back());
        }
        for (double& p : priors)
            p /= sum;
        const signal_set set(points, labels, 4, priors);
        const predictor map(set), ml(set, std::make_shared<awgn>(), detector::ml);
        for (const double db : {-10.0, 0.0, 10.0, 20.0}) {
            const auto r = map.at(from_db(db));
            EXPECT_LE(r.exact.ser, ml.ser(from_db(db)) * (1 + 1e-12));
            EXPECT_LE(r.exact.ser, r.facing.ser * (1 + 1e-12));
            EXPECT_LE(r.facing.ser, r.union_bound.ser * (1 + 1e-12));
        }
    }
}

TEST(MapRates, FadingIsTheIntegralOverTheFade)
{
    // Two points: ∫ f(g)·P(g·Es/N0) dg with the handbook's P, by Boost's adaptive Gauss–Kronrod rule;
    // densities written out here: gamma of shape m·L, and the Rician power as its Poisson mixture of gammas.
    const double rare = 0.1;
    const signal_set two({{-1, 0}, {1, 0}}, {0, 1}, 1, {1 - rare, rare});
    const auto gamma_density = [](double g, double shape, double rate) {
        return std::exp(shape * std::log(rate) + (shape - 1) * std::log(g) - rate * g - std::lgamma(shape));
    };
    const auto rician_density = [&](double g, double k) {
        double sum = 0;
        for (int n = 0; n < 120; ++n)
            sum += std::exp(-k + n * std::log(k) - std::lgamma(n + 1.0)) * gamma_density(g, n + 1, 1 + k);
        return sum;
    };
    const std::vector<std::pair<std::string, std::function<double(double)>>> laws{
        {"rayleigh", [&](double g) { return gamma_density(g, 1, 1); }},
        {"nakagami:2.5", [&](double g) { return gamma_density(g, 2.5, 2.5); }},
        {"rayleigh*3", [&](double g) { return gamma_density(g, 3, 1); }},
        {"rician:5", [&](double g) { return rician_density(g, std::pow(10.0, 0.5)); }},
    };
    double worst = 0;
    for (const auto& [name, density] : laws)
        for (const double db : {-5.0, 5.0, 15.0, 30.0}) {
            const double gamma = from_db(db) / two.es();
            const auto integrand = [&, f = density](double s) {
                const double g = std::exp(s), n0 = 1 / (gamma * g), odds = std::log((1 - rare) / rare);
                return g * f(g) *
                       ((1 - rare) * q_function((4 + n0 * odds) / std::sqrt(8 * n0)) +
                        rare * q_function((4 - n0 * odds) / std::sqrt(8 * n0)));
            };
            double expected = 0;
            for (double s = -40; s < 6; s += 2)
                expected += boost::math::quadrature::gauss_kronrod<double, 61>::integrate(
                    integrand, s, s + 2, 8, 1e-13);
            const double error = std::abs(predictor(two, parse_law(name)).ser(from_db(db)) / expected - 1);
            EXPECT_LE(error, map_fading_rate_accuracy) << name << " at " << db << " dB";
            worst = std::max(worst, error);
        }
    std::printf("MAP under fading: worst relative error %.1e\n", worst);
}

TEST(MapRates, FadingRowsSumToOneAndMatchTheRates)
{
    const signal_set set({{-1, 0.2}, {0, 1}, {1, 0}, {0.3, -1.4}}, {0, 1, 3, 2}, 2, {0.1, 0.2, 0.3, 0.4});
    const predictor p(set, parse_law("rayleigh"));
    const auto r = p.at(from_db(12)).exact;
    for (std::size_t i = 0; i < 4; ++i) {
        const auto row = p.transition_row(from_db(12), i);
        double sum = 0;
        for (const double x : row)
            sum += x;
        EXPECT_NEAR(sum, 1, map_fading_rate_accuracy);
        EXPECT_NEAR((sum - row[i]) / r.ser_by_point[i], 1, map_fading_rate_accuracy);
    }
}

TEST(MapRates, ImpulsiveNoiseIsRefusedWithItsReason)
{
    const signal_set two({{-1, 0}, {1, 0}}, {0, 1}, 1, {0.9, 0.1});
    try {
        predictor(two, parse_law("impulsive:0.1:0.01"));
        FAIL() << "accepted";
    } catch (const std::invalid_argument& e) {
        EXPECT_NE(std::string(e.what()).find("no straight borders"), std::string::npos) << e.what();
    }
    EXPECT_GT(predictor(two, parse_law("impulsive:0.1:0.01"), detector::ml).ser(10), 0);
    EXPECT_GT(predictor(two.with_priors({}), parse_law("impulsive:0.1:0.01")).ser(10), 0);
}
