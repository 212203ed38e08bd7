// SPDX-License-Identifier: GPL-3.0-or-later
// closed_forms: rates of PSK and square QAM under every law, closed_forms.csv by closed_forms.py (sources
// there).
#include "table_reader.h"

#include "halfplane/rates.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <map>

using namespace halfplane;

namespace {

constexpr double epsilon = 2.220446049250313e-16;

signal_set psk(std::size_t m)
{
    std::vector<complex> points;
    for (std::size_t k = 0; k < m; ++k)
        points.push_back(std::polar(1.0, 2 * M_PI * static_cast<double>(k) / static_cast<double>(m)));
    return signal_set::with_natural_labels(std::move(points));
}

label_t gray(std::size_t k)
{
    return static_cast<label_t>(k ^ (k >> 1));
}

signal_set qam(std::size_t m)
{
    const auto n = static_cast<std::size_t>(std::lround(std::sqrt(m)));
    const auto bits = static_cast<unsigned>(std::lround(std::log2(n)));
    std::vector<complex> points;
    std::vector<label_t> labels;
    for (std::size_t q = 0; q < n; ++q)
        for (std::size_t i = 0; i < n; ++i) {
            points.emplace_back(2.0 * i - n + 1, 2.0 * q - n + 1);
            labels.push_back(static_cast<label_t>(gray(q) << bits | gray(i)));
        }
    return {std::move(points), std::move(labels), 2 * bits};
}

double promised(const std::string& law)
{
    if (law == "awgn")
        return rate_accuracy;
    return law.rfind("impulsive", 0) == 0 ? impulsive_rate_accuracy : fading_rate_accuracy;
}

/*!
 * How far the rounding of coordinates alone may move a rate: points on a circle stand up to one unit in the
 * last place off, their distance d is wrong by as much, and d ln P = 2 ln P · dd/d.
 */
double coordinate_rounding(const signal_set& set, double ln_p)
{
    const bool on_a_grid = set.points()[0].real() == std::floor(set.points()[0].real()) && set.size() != 2 &&
                           std::abs(set.points()[0].real()) > 1;
    return on_a_grid ? 0 : 2 * (1 + std::abs(ln_p)) * 2 * epsilon / set.d_min();
}

} // namespace

TEST(ClosedForms, SerAndBerOfPskAndQamUnderEveryLaw)
{
    struct worst {
        int cases = 0;
        double error = 0, smallest = 1;
        std::string at;
    };
    std::map<std::string, worst> summary;
    double worst_inverse = 0;
    int inverses = 0;
    std::map<std::string, predictor> predictors;
    const auto table = read_table("closed_forms.csv");
    ASSERT_GE(table.size(), 500u);
    for (const auto& row : table) {
        const auto& law = row[0];
        const auto key = law + " " + row[1];
        if (!predictors.count(key)) {
            const auto size = std::stoul(row[1].substr(4));
            predictors.emplace(
                key, predictor(row[1].substr(0, 3) == "psk" ? psk(size) : qam(size), parse_law(law)));
        }
        const auto& p = predictors.at(key);
        const double es_n0 = from_db(std::stod(row[3])), ln_expected = std::stod(row[5]);
        const double ln_got = row[2] == "ser" ? p.ln_ser(es_n0) : p.ln_ber(es_n0);
        auto& kind = summary[law + " " + row[1].substr(0, 3) + " " + row[2] +
                             (ln_expected < std::log(1e-290) ? " (ln P)" : "")];
        ++kind.cases;
        // Below 1e-290 the logarithm counts, above it the rate itself.
        double error, bound;
        const double rounding = coordinate_rounding(p.set(), ln_expected);
        if (ln_expected < std::log(1e-290)) {
            error = std::abs(ln_got - ln_expected);
            bound = ln_rate_accuracy + rounding;
        } else {
            const double expected = std::strtod(row[4].c_str(), nullptr);
            error = std::abs((row[2] == "ser" ? p.ser(es_n0) : p.ber(es_n0)) / expected - 1);
            bound = promised(law) + rounding;
            kind.smallest = std::min(kind.smallest, expected);
        }
        EXPECT_LE(error, bound) << key << " " << row[2] << " at " << row[3] << " dB";
        if (ln_expected > std::log(1e-280)) {
            // The inverse, from the published rate back to its Es/N0: an error of the rate moves it by
            // 1/slope.
            const double rate = std::strtod(row[4].c_str(), nullptr);
            const auto found = row[2] == "ser" ? p.es_n0_for_ser(rate) : p.es_n0_for_ber(rate);
            ASSERT_TRUE(found) << key << " " << row[2] << " " << rate;
            const double decades =
                row[2] == "ser" ? p.ser_decades_per_db(es_n0) : p.ber_decades_per_db(es_n0);
            const double slope = std::abs(10 * decades); // d ln P / d ln(Es/N0)
            const double off = std::abs(std::log(*found / es_n0));
            EXPECT_LE(off, 2e-12 + bound / slope) << key << " " << row[2] << " back from " << rate;
            worst_inverse = std::max(worst_inverse, off / (1 + 1 / slope));
            ++inverses;
        }
        if (error >= kind.error) {
            kind.error = error;
            kind.at = row[1] + " at " + row[3] + " dB";
        }
    }
    std::printf("%d inverses, worst error %.1e of Es/N0 (times 1 + 1/slope)\n", inverses, worst_inverse);
    EXPECT_GT(inverses, 400);
    for (const auto& [kind, w] : summary)
        std::printf("%-32s %3d cases, worst error %.1e at %s, down to %.0e\n",
                    kind.c_str(),
                    w.cases,
                    w.error,
                    w.at.c_str(),
                    w.smallest);
}
