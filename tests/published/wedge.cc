// SPDX-License-Identifier: GPL-3.0-or-later
// wedge: against mpmath at 40 digits, wedge_table.csv by wedge_table.py.
#include "table_reader.h"

#include "halfplane/wedge.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <map>

using namespace halfplane;

TEST(Wedge, AgreesWithMpmathFromOneHalfTo1e300)
{
    struct worst {
        int cases = 0;
        double error = 0, ln_error = 0;
        std::string row;
    };
    std::map<std::string, worst> by_kind;
    double smallest = 1, largest = 0;
    const auto table = read_table("wedge_table.csv");
    ASSERT_GE(table.size(), 2000u);
    for (const auto& row : table) {
        const double h = std::stod(row[1]), x1 = std::stod(row[2]), x2 = std::stod(row[3]);
        const double expected = std::strtod(row[4].c_str(), nullptr);
        const auto w = wedge(h, x1, x2);
        const double error = std::abs(w.value() / expected - 1);
        auto& kind = by_kind[row[0]];
        ++kind.cases;
        if (!(error <= kind.error)) {
            kind.error = error;
            kind.row = row[1] + " " + row[2] + " " + row[3] + " " + row[4];
        }
        kind.ln_error = std::max(kind.ln_error, std::abs(w.ln() - std::log(expected)));
        EXPECT_LE(error, wedge_accuracy) << row[0] << " h " << h << " from " << x1 << " to " << x2;
        smallest = std::min(smallest, expected);
        largest = std::max(largest, expected);
    }
    for (const auto& [kind, w] : by_kind)
        std::printf("%-10s %4d cases, worst relative error %.2e (ln: %.1e) at %s\n",
                    kind.c_str(),
                    w.cases,
                    w.error,
                    w.ln_error,
                    w.row.c_str());
    EXPECT_GT(largest, 0.45);
    EXPECT_LT(smallest, 1e-290);
}

TEST(Wedge, LimitsAndSymmetry)
{
    constexpr double inf = INFINITY;
    EXPECT_DOUBLE_EQ(wedge(0, -inf, inf).value(), 0.5) << "the mean on an infinite edge";
    EXPECT_DOUBLE_EQ(wedge(0, 0, inf).value(), 0.25);
    EXPECT_EQ(wedge(0, 1, 2).value(), 0) << "on the line but beside the edge";
    EXPECT_EQ(wedge(1, 2, 2).value(), 0);
    EXPECT_EQ(wedge(1, inf, inf).value(), 0);
    EXPECT_DOUBLE_EQ(wedge(2, -1, 3).value(), wedge(2, -3, 1).value());
    EXPECT_NEAR(wedge(3, -5, 7).value() / (wedge(3, -5, 1).value() + wedge(3, 1, 7).value()), 1, 1e-13);
    // e^-5000 and beyond: Q(x) = φ(x)/x·(1 − 1/x² + 3/x⁴ − …), DLMF 7.12.1
    for (const double x : {100.0, 1e3, 1e4}) {
        const double expected =
            -0.5 * x * x - std::log(x * std::sqrt(2 * M_PI)) + std::log1p(-1 / (x * x) + 3 / std::pow(x, 4));
        EXPECT_NEAR(wedge(x, -inf, inf).ln(), expected, 1e-9) << x;
    }
}
