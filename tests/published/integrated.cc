// SPDX-License-Identifier: GPL-3.0-or-later
// integrated: irregular sets against integration over the plane, integrated.json by integrated.py.
#include "halfplane/cells.h"
#include "halfplane/rates.h"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <cmath>
#include <cstdio>
#include <fstream>
#include <map>

using namespace halfplane;

namespace {

/// What the reference itself is good for: panels agree to 1e-13, ndtr to a few 1e-15, sums over 1,000 terms.
constexpr double reference_accuracy = 1e-11;

std::vector<complex> zipped(const nlohmann::json& i, const nlohmann::json& q)
{
    std::vector<complex> out;
    for (std::size_t k = 0; k < i.size(); ++k)
        out.emplace_back(i[k].get<double>(), q[k].get<double>());
    return out;
}

struct worst {
    int cases = 0;
    double error = 0;
};

class Integrated : public ::testing::Test
{
protected:
    void compare(const std::string& what, double got, double expected)
    {
        // Probabilities down to 1e-18 are compared by ratio; the reference gives smaller ones to 1e-30 only.
        const double error = std::abs(got - expected) / std::max(expected, 1e-18);
        auto& w = d_worst[what];
        ++w.cases;
        w.error = std::max(w.error, error);
        EXPECT_LE(error, reference_accuracy)
            << d_name << ' ' << what << " got " << got << ", expected " << expected;
    }
    void compare(const std::string& what, const std::vector<double>& got, const nlohmann::json& expected)
    {
        ASSERT_EQ(got.size(), expected.size());
        for (std::size_t k = 0; k < got.size(); ++k)
            compare(what, got[k], expected[k].get<double>());
    }
    void TearDown() override
    {
        for (const auto& [what, w] : d_worst)
            std::printf("%-24s %5d numbers, worst relative error %.1e\n", what.c_str(), w.cases, w.error);
    }

    std::string d_name;
    std::map<std::string, worst> d_worst;
};

} // namespace

TEST_F(Integrated, ExactFacingUnionMapDisplacedAndShaped)
{
    std::ifstream in(std::string(HALFPLANE_TEST_DIR) + "/integrated.json");
    const auto cases = nlohmann::json::parse(in);
    ASSERT_GE(cases.size(), 100u);
    for (const auto& c : cases) {
        const double es_n0 = from_db(c["es_n0_db"].get<double>());
        d_name = c["name"].get<std::string>() + " at " + c["es_n0_db"].dump() + " dB";
        const signal_set set(zipped(c["i"], c["q"]),
                             c["labels"].get<std::vector<label_t>>(),
                             c["label_bits"].get<unsigned>(),
                             c.value("priors", std::vector<double>{}));
        noise_shape shape;
        if (c.contains("shape")) {
            shape = {c["shape"][0],
                     c["shape"][1],
                     c["shape"][2],
                     c["metric"] == "matched" ? metric::matched : metric::nearest};
        }
        const std::string detector = c["detector"];
        const predictor p(set, std::make_shared<awgn>(), parse_detector(detector), shape);
        std::string kind = c.contains("shape") ? "shaped " : "";
        kind += c.contains("mean_i") ? "displaced " : "";
        kind += detector;
        exact_rung exact;
        if (c.contains("mean_i")) {
            exact = p.displaced(es_n0, zipped(c["mean_i"], c["mean_q"]));
        } else {
            exact = p.at(es_n0).exact;
            compare(kind + " row", p.transition_row(es_n0, 0), c["row_0"]);
        }
        compare(kind + " ser", exact.ser, c["ser"]);
        compare(kind + " ber", exact.ber, c["ber"]);
        compare(kind + " by point", exact.ser_by_point, c["ser_by_point"]);
        compare(kind + " by bit", exact.ber_by_bit, c["ber_by_bit"]);
        if (c.contains("union")) {
            const auto bound = p.at(es_n0).union_bound;
            compare(kind + " union", bound.ser, c["union"]["ser"]);
            compare(kind + " union", bound.ber, c["union"]["ber"]);
        }
        if (c.contains("facing")) {
            const auto bound = p.at(es_n0).facing;
            compare(kind + " facing", bound.ser, c["facing"]["ser"]);
            compare(kind + " facing", bound.ber, c["facing"]["ber"]);
            std::vector<std::vector<std::size_t>> pairs;
            for (std::size_t i = 0; i < set.size(); ++i)
                for (const auto j : p.facing(es_n0, i))
                    if (i < j)
                        pairs.push_back({i, j});
            EXPECT_EQ(pairs, c["facing_pairs"].get<decltype(pairs)>()) << d_name;
        }
    }
}
