// SPDX-License-Identifier: GPL-3.0-or-later
// explanation: rows of the report worked by hand, when they are made anew, and that they can be switched off.
#include "../../lib/link/explanation.h"
#include "../../lib/link/report_parts.h"
#include "simulated.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

using namespace halfplane;
using namespace halfplane::link;
using namespace halfplane::testing;

TEST(Explanation, RowsByHand)
{
    // −20 dB is a hundredth of the power; rows without power or test carry no such field.
    EXPECT_EQ(losses_of({{cause::phase_noise, -20.0, 0.75},
                         {cause::interaction, std::nullopt, -0.25},
                         {cause::unexplained, std::nullopt, 0.0}})
                  .dump(),
              R"([{"cause":"phase_noise","power_db":-20.0,"cost_db":0.75},)"
              R"({"cause":"interaction","cost_db":-0.25},{"cause":"unexplained","cost_db":0.0}])");
    EXPECT_EQ(premises_of({{"white", premise_state::holds, 0.5, 0.0},
                           {"circular", premise_state::fails, 0.0, 1.5},
                           {"linear", premise_state::too_few, std::nullopt, std::nullopt}})
                  .dump(),
              R"([{"name":"white","p":0.5,"effect_db":0.0,"state":"holds"},)"
              R"({"name":"circular","p":0.0,"effect_db":1.5,"state":"fails"},)"
              R"({"name":"linear","state":"too_few"}])");
    EXPECT_EQ(losses_of({}).dump(), "[]");
    EXPECT_EQ(failing_of({{"white", premise_state::holds, 0.5, 0.0},
                          {"circular", premise_state::fails, 0.0, 1.5},
                          {"linear", premise_state::too_few, std::nullopt, std::nullopt}})
                  .dump(),
              R"(["circular"])");
}

TEST(Explanation, EveryCauseHasAName)
{
    std::vector<std::string> names;
    for (int c = 0; c <= static_cast<int>(cause::unexplained); ++c)
        names.emplace_back(to_string(static_cast<cause>(c)));
    std::sort(names.begin(), names.end());
    EXPECT_EQ(std::unique(names.begin(), names.end()), names.end());
    EXPECT_EQ(std::count(names.begin(), names.end(), ""), 0);
}

TEST(Explanation, StandsInTheReportAndCanBeSwitchedOff)
{
    const auto set = named_set("qam:16");
    const auto s = simulate(set, 60000, 14, 3);
    report last;
    for (const bool explain : {true, false}) {
        watch_options options;
        options.explain = explain;
        watch measured(set, options);
        const auto keep = [&](watch::window&& w) { last = measured.report_of(std::move(w)); };
        measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), keep);
        EXPECT_EQ(last.contains("losses"), explain);
        EXPECT_EQ(last.contains("premises"), explain);
        EXPECT_EQ(last.contains("explained_symbols"), explain);
        EXPECT_EQ(measured.settings().value("explain", true), explain);
        if (!explain)
            continue;
        // 60,000 symbols: a stretch of 512 in each period of 4,096, the last period cut.
        const auto explained = last["explained_symbols"].get<std::uint64_t>();
        EXPECT_TRUE(explained == 14 * 512 || explained == 15 * 512) << explained;
        EXPECT_EQ(last["premises"].size(), 8u);
        for (const auto& premise : last["premises"])
            EXPECT_EQ(premise["state"], "holds") << premise;
        // A clean link without a known input: nothing but what chance leaves of the count.
        ASSERT_EQ(last["losses"].size(), 1u) << last["losses"];
        EXPECT_EQ(last["losses"][0]["cause"], "unexplained");
        EXPECT_NEAR(last["losses"][0]["cost_db"].get<double>(), 0, 0.1); // 2,400 errors: 2 % of SER, 0.03 dB
    }
}

TEST(Explanation, MergedWindowsExplainTheSame)
{
    const auto set = named_set("psk:8");
    const auto s = simulate(set, 50000, 13, 4);
    std::vector<report> all;
    for (const bool merged : {false, true}) {
        watch measured(set, {});
        measured.set_input({13});
        std::optional<watch::window> waiting;
        measured.add(s.samples.data(), s.reference.data(), nullptr, s.samples.size(), [&](watch::window&& w) {
            if (!merged)
                measured.report_of(std::move(w));
            else if (waiting)
                waiting->merge(std::move(w));
            else
                waiting = std::move(w);
        });
        if (waiting)
            measured.report_of(std::move(*waiting));
        measured.close([&](watch::window&& w) { all.push_back(measured.report_of(std::move(w), true)); },
                       true);
    }
    EXPECT_EQ(all[0]["explained_symbols"], all[1]["explained_symbols"]);
    ASSERT_EQ(all[0]["premises"].size(), all[1]["premises"].size());
    for (std::size_t k = 0; k < all[0]["premises"].size(); ++k)
        EXPECT_NEAR(all[0]["premises"][k]["p"].get<double>(), all[1]["premises"][k]["p"].get<double>(), 1e-9);
    ASSERT_EQ(all[0]["losses"].size(), all[1]["losses"].size());
    for (std::size_t k = 0; k < all[0]["losses"].size(); ++k)
        EXPECT_NEAR(
            all[0]["losses"][k]["cost_db"].get<double>(), all[1]["losses"][k]["cost_db"].get<double>(), 1e-9);
}
