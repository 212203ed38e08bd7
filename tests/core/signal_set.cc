// SPDX-License-Identifier: GPL-3.0-or-later
// signal_set: facts of small sets worked by hand, and every refusal with its message.
#include "halfplane/signal_set.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <string>

using halfplane::complex;
using halfplane::invalid_set;
using halfplane::label_t;
using halfplane::signal_set;

namespace {

std::string refusal(std::vector<complex> points,
                    std::vector<label_t> labels,
                    unsigned bits,
                    std::vector<double> priors = {})
{
    try {
        signal_set(std::move(points), std::move(labels), bits, std::move(priors));
    } catch (const invalid_set& e) {
        return e.what();
    }
    return "accepted";
}

constexpr double not_a_number = std::numeric_limits<double>::quiet_NaN();
constexpr double inf = std::numeric_limits<double>::infinity();

} // namespace

TEST(SignalSet, FactsOfASmallSetByHand)
{
    // Points 0, 2, 2i with priors 1/2, 1/4, 1/4: Es = 0 + 4/4 + 4/4 = 2; H = 1/2 + 2·(1/4·2) = 3/2 bits.
    const signal_set set({{0, 0}, {2, 0}, {0, 2}}, {0, 1, 2}, 2, {0.5, 0.25, 0.25});
    EXPECT_DOUBLE_EQ(set.es(), 2.0);
    EXPECT_DOUBLE_EQ(set.entropy_bits(), 1.5);
    EXPECT_DOUBLE_EQ(set.eb(), 4.0 / 3.0);
    EXPECT_DOUBLE_EQ(set.mean().real(), 0.5);
    EXPECT_DOUBLE_EQ(set.mean().imag(), 0.5);
    EXPECT_DOUBLE_EQ(set.papr_db(), 10 * std::log10(2.0));
    EXPECT_DOUBLE_EQ(set.d_min(), 2.0);
    EXPECT_FALSE(set.uniform());
    EXPECT_EQ(set.label_string(2), "10");
    EXPECT_EQ(set.index_of_label(2), 2);
    EXPECT_EQ(set.index_of_label(3), -1);
    EXPECT_EQ(set.index_of_label(4096), -1);
}

TEST(SignalSet, PointsStayAsGivenAndScalingIsAskedFor)
{
    const auto set = signal_set::with_natural_labels({{3, 0}, {-3, 0}, {0, 5}});
    EXPECT_EQ(set.points()[0], complex(3, 0));
    EXPECT_EQ(set.label_bits(), 2u);
    const auto turned = set.scaled({0, 2});
    EXPECT_EQ(turned.points()[0], complex(0, 6));
    EXPECT_TRUE(turned.uniform());
    EXPECT_DOUBLE_EQ(turned.d_min(), 2 * set.d_min());
}

TEST(SignalSet, ClosestDistanceEqualsBruteForce)
{
    std::uint64_t state = 5;
    auto next = [&] {
        return static_cast<double>((state = state * 6364136223846793005u + 1442695040888963407u) >> 40);
    };
    for (std::size_t m : {2u, 3u, 4u, 7u, 33u, 500u}) {
        std::vector<complex> points(m);
        for (auto& p : points)
            p = {next(), next()};
        double best = inf;
        for (std::size_t a = 0; a < m; ++a)
            for (std::size_t b = 0; b < a; ++b)
                best = std::min(best, std::abs(points[a] - points[b]));
        EXPECT_NEAR(signal_set::with_natural_labels(points).d_min(), best, 1e-12 * best) << m;
    }
}

TEST(SignalSet, EveryRefusalNamesWhatAndWhere)
{
    EXPECT_EQ(refusal({{1, 0}}, {0}, 1), "a set needs at least 2 points, got 1");
    EXPECT_EQ(refusal({{1, 0}, {not_a_number, 0}}, {0, 1}, 1), "point 1 is not finite: (nan, 0)");
    EXPECT_EQ(refusal({{1, 0}, {0, -inf}}, {0, 1}, 1), "point 1 is not finite: (0, -inf)");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}, {1, 0}}, {0, 1, 2}, 2), "point 2 equals point 0: (1, 0)");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {1, 1}, 1), "points 0 and 1 share the label 1");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {0, 2}, 1), "label of point 1 has more than 1 bits: 2");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {0, 1}, 13), "labels have 1 to 12 bits, got 13");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {0}, 1),
              "as many labels as points are needed: 1 labels for 2 points");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {0, 1}, 1, {1.0, 0.0}),
              "prior of point 1 must be a positive number, got 0");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {0, 1}, 1, {1.5, -0.5}),
              "prior of point 1 must be a positive number, got -0.5");
    EXPECT_EQ(refusal({{1, 0}, {2, 0}}, {0, 1}, 1, {0.5, 0.25}),
              "priors must sum to 1 within 1e-06, they sum to 0.75");
    EXPECT_EQ(refusal(std::vector<complex>(4097), std::vector<label_t>(4097), 12),
              "a set has at most 4096 points, got 4097");
    EXPECT_NE(refusal({{1e-170, 0}, {-1e-170, 0}}, {0, 1}, 1).find("scale the points"), std::string::npos);
    EXPECT_NE(refusal({{1e170, 0}, {-1e170, 0}}, {0, 1}, 1).find("scale the points"), std::string::npos);
}
