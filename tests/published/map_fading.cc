// SPDX-License-Identifier: GPL-3.0-or-later
// map_fading: MAP decisions under fading against integration over plane and fade, map_fading.json by
// map_fading.py.
#include "halfplane/rates.h"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <cmath>
#include <cstdio>
#include <fstream>

using namespace halfplane;

TEST(MapFading, SerAndBerOfIrregularSetsUnderThreeLaws)
{
    std::ifstream file(std::string(HALFPLANE_TEST_DIR) + "/map_fading.json");
    const auto table = nlohmann::json::parse(file);
    ASSERT_GE(table.size(), 7u);
    double worst = 0;
    for (const auto& row : table) {
        std::vector<complex> points;
        for (std::size_t k = 0; k < row["i"].size(); ++k)
            points.emplace_back(row["i"][k].get<double>(), row["q"][k].get<double>());
        const predictor p(signal_set(points,
                                     row["labels"].get<std::vector<label_t>>(),
                                     row["label_bits"].get<unsigned>(),
                                     row["priors"].get<std::vector<double>>()),
                          parse_law(row["law"].get<std::string>()));
        ASSERT_EQ(p.rule(), detector::map);
        const double es_n0 = from_db(row["es_n0_db"].get<double>());
        for (const char* what : {"ser", "ber"}) {
            const double expected = row[what].get<double>();
            const double got = what[0] == 's' ? p.ser(es_n0) : p.ber(es_n0);
            const double error = std::abs(got / expected - 1);
            // The table's own error, as the quadrature that made it estimates it, comes on top.
            EXPECT_LE(error,
                      map_fading_rate_accuracy + row[std::string(what) + "_error"].get<double>() / expected)
                << row["name"] << " " << row["law"] << " " << row["es_n0_db"] << " " << what;
            worst = std::max(worst, error);
        }
    }
    std::printf("MAP under fading: %zu cases, worst relative error %.1e\n", table.size(), worst);
}
