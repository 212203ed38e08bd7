// SPDX-License-Identifier: GPL-3.0-or-later
// Golden reports: every field of every report of three streams that were worked by hand (golden/README.md,
// golden/derive.py).
#include "halfplane/link/watch.h"

#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <limits>

using namespace halfplane;
using namespace halfplane::link;

namespace {

constexpr double tolerance = 1e-9; // relative

/// Both documents have the same fields, the same texts and integers, and numbers within the tolerance.
void expect_same(const report& expected, const report& got, const std::string& where, double& worst)
{
    if (expected.is_object()) {
        ASSERT_TRUE(got.is_object()) << where;
        for (const auto& [key, value] : expected.items()) {
            ASSERT_TRUE(got.contains(key)) << where << '.' << key << " is missing";
            expect_same(value, got.at(key), where + "." + key, worst);
        }
        for (const auto& [key, value] : got.items())
            EXPECT_TRUE(expected.contains(key)) << where << '.' << key << " is not expected: " << value;
    } else if (expected.is_array()) {
        ASSERT_TRUE(got.is_array()) << where;
        ASSERT_EQ(expected.size(), got.size()) << where << ": " << got;
        for (std::size_t k = 0; k < expected.size(); ++k)
            expect_same(expected[k], got[k], where + "[" + std::to_string(k) + "]", worst);
    } else if (expected.is_number_float()) {
        ASSERT_TRUE(got.is_number()) << where;
        const double e = expected, g = got;
        const double off = e == g ? 0 : std::abs(g - e) / std::abs(e);
        EXPECT_LE(off, tolerance) << where << ": expected " << expected << ", got " << got;
        worst = std::max(worst, off);
    } else {
        EXPECT_EQ(expected, got) << where;
    }
}

double number(const report& value)
{
    if (!value.is_string())
        return value;
    return value == "nan" ? std::numeric_limits<double>::quiet_NaN()
                          : std::numeric_limits<double>::infinity();
}

void replay(const std::string& name, std::size_t piece)
{
    SCOPED_TRACE(name);
    std::ifstream file(std::string(HALFPLANE_TEST_DIR) + "/golden/" + name + ".json");
    ASSERT_TRUE(file) << "no golden file " << name;
    const auto golden = report::parse(file);

    std::vector<complex> points;
    std::vector<label_t> labels;
    for (const auto& p : golden["set"]["points"])
        points.emplace_back(p[0], p[1]);
    for (const std::string label : golden["set"]["labels"])
        labels.push_back(static_cast<label_t>(std::stoi(label, nullptr, 2)));
    const signal_set set(points, labels, 2, {}, golden["set"]["name"]);

    watch_options options;
    options.pattern = golden["options"]["pattern"];
    options.confidence = golden["options"]["confidence"];
    options.window = golden["options"]["window"];
    options.symbol_rate = golden["options"]["symbol_rate"];
    options.trial = {golden["options"]["target"],
                     golden["options"]["frame_symbols"],
                     golden["options"]["max_excluded"],
                     golden["options"]["dependence"]};
    options.clock = [&] { return golden["options"]["clock"].get<std::string>(); };
    watch measured(set, options);

    const auto& lock = golden["lock"];
    measured.set_lock({lock["state"] == "held" ? lock_state::held : lock_state::searching,
                       lock["delay"],
                       lock["rotation_deg"],
                       lock["mirrored"],
                       lock["inverted"],
                       lock["frequency"],
                       lock["slips"]});
    const auto& input = golden["input"];
    measured.set_input({input["es_n0_db"], input["es_n0_db_se"], input["source"] == "measured"});
    measured.set_pending(golden["pending"]);

    std::vector<std::complex<float>> samples;
    std::vector<reference_t> reference;
    for (const auto& row : golden["stream"]) {
        samples.emplace_back(static_cast<float>(number(row[0])), static_cast<float>(number(row[1])));
        reference.push_back(row[2]);
    }

    std::vector<report> reports;
    const auto keep = [&](watch::window&& w) { reports.push_back(measured.report_of(std::move(w))); };
    for (std::size_t k = 0; k < samples.size(); k += piece)
        measured.add(&samples[k], &reference[k], nullptr, std::min(piece, samples.size() - k), keep);
    measured.close(keep);

    double worst = 0;
    ASSERT_EQ(reports.size(), golden["reports"].size());
    for (std::size_t k = 0; k < reports.size(); ++k)
        expect_same(golden["reports"][k], reports[k], name + "[" + std::to_string(k) + "]", worst);
    std::cout << name << ": " << reports.size() << " reports, largest relative difference " << worst << '\n';
}

} // namespace

TEST(Golden, Clean)
{
    replay("clean", 1000);
}

TEST(Golden, GapIsJudged)
{
    replay("gap", 1000);
}

TEST(Golden, SlipAndNotANumber)
{
    replay("slip", 1000);
}

TEST(Golden, PiecesInWhichTheStreamArrivesMakeNoDifference)
{
    for (std::size_t piece : {1, 3, 7})
        for (const char* name : {"clean", "gap", "slip"})
            replay(name, piece);
}
