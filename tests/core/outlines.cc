// SPDX-License-Identifier: GPL-3.0-or-later
// outlines: squares and a MAP threshold known by hand, areas that fill the frame, the decision rule itself.
#include "halfplane/outlines.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <random>

using namespace halfplane;

namespace {

double area(const std::vector<complex>& p)
{
    double twice = 0;
    for (std::size_t k = 0; k < p.size(); ++k) {
        const complex a = p[k], b = p[(k + 1) % p.size()];
        twice += a.real() * b.imag() - a.imag() * b.real();
    }
    return twice / 2;
}

/// Whether y lies within a convex outline, by more than a margin where inside.
bool holds(const std::vector<complex>& p, complex y, double margin)
{
    for (std::size_t k = 0; k < p.size(); ++k) {
        const complex along = p[(k + 1) % p.size()] - p[k], to = y - p[k];
        if (along.real() * to.imag() - along.imag() * to.real() < -margin * std::abs(along))
            return false;
    }
    return !p.empty();
}

} // namespace

TEST(outlines, inner_cells_of_qam_are_squares)
{
    const auto set = load_set("qam:16");
    const auto all = outlines(set, 0, {-4, 4, -4, 4});
    for (std::size_t i = 0; i < set.size(); ++i) {
        const complex s = set.points()[i];
        ASSERT_EQ(all[i].size(), 4u);
        for (const complex v : all[i]) {
            // Corners on even integers, or on the frame, each a unit from the point in both directions.
            EXPECT_NEAR(std::abs(v.real() - s.real()), 1, 1e-9);
            EXPECT_NEAR(std::abs(v.imag() - s.imag()), 1, 1e-9);
        }
        EXPECT_NEAR(area(all[i]), 4, 1e-9); // positive: counter-clockwise
    }
}

TEST(outlines, a_map_threshold_stands_where_the_formula_has_it)
{
    // |y−1|² − N0 ln p = |y+1|² − N0 ln q on the real axis: y = N0 ln(q/p) / 4.
    const signal_set set({1.0, -1.0}, {0, 1}, 1, {0.9, 0.1});
    const double n0 = 0.8, threshold = n0 * std::log(0.1 / 0.9) / 4;
    const auto all = outlines(set, n0, {-2, 2, -1, 1});
    EXPECT_NEAR(area(all[0]), 2 * (2 - threshold), 1e-9);
    EXPECT_NEAR(area(all[1]), 2 * (threshold + 2), 1e-9);
    EXPECT_NEAR(area(outlines(set, 0, {-2, 2, -1, 1})[0]), 4, 1e-9);
}

TEST(outlines, a_point_without_a_map_cell_has_none)
{
    const signal_set set({-1.0, 0.0, 1.0}, {0, 1, 2}, 2, {0.4995, 0.001, 0.4995});
    const auto all = outlines(set, 1, {-2, 2, -2, 2});
    EXPECT_TRUE(all[1].empty());
    EXPECT_NEAR(area(all[0]) + area(all[2]), 16, 1e-9);
}

TEST(outlines, fill_the_frame_and_agree_with_the_decision_rule)
{
    std::mt19937_64 engine(7);
    std::uniform_real_distribution<double> unit(-1, 1), prior(0.2, 1);
    for (int round = 0; round < 20; ++round) {
        std::vector<complex> points;
        std::vector<label_t> labels;
        std::vector<double> priors;
        double sum = 0;
        for (unsigned i = 0; i < 40; ++i) {
            points.emplace_back(30 * unit(engine), 30 * unit(engine));
            labels.push_back(static_cast<label_t>(i));
            priors.push_back(prior(engine));
            sum += priors.back();
        }
        for (auto& p : priors)
            p /= sum;
        const signal_set set(points, labels, 6, priors);
        const double n0 = round % 2 ? 20.0 : 0.0;
        const auto all = outlines(set, n0, {-40, 35, -33, 41});
        double filled = 0;
        for (const auto& each : all)
            filled += area(each);
        EXPECT_NEAR(filled, 75.0 * 74.0, 1e-6);
        for (int k = 0; k < 500; ++k) {
            const complex y(-2.5 + 37.5 * unit(engine), 4 + 37 * unit(engine));
            std::size_t best = 0;
            double least = std::numeric_limits<double>::infinity();
            for (std::size_t i = 0; i < set.size(); ++i) {
                const double metric = std::norm(y - points[i]) - n0 * std::log(priors[i]);
                if (metric < least) {
                    least = metric;
                    best = i;
                }
            }
            EXPECT_TRUE(holds(all[best], y, 1e-7)) << "round " << round << ", y " << y;
        }
    }
}

TEST(outlines, refuse_what_cannot_be)
{
    const auto set = load_set("psk:4");
    EXPECT_THROW(outlines(set, -1, {-1, 1, -1, 1}), std::invalid_argument);
    EXPECT_THROW(outlines(set, std::nan(""), {-1, 1, -1, 1}), std::invalid_argument);
    EXPECT_THROW(outlines(set, 0, {1, 1, -1, 1}), std::invalid_argument);
    EXPECT_THROW(outlines(set, 0, {-1, std::numeric_limits<double>::infinity(), -1, 1}),
                 std::invalid_argument);
}
