// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: its state as a document.
#include "halfplane/verdict.h"

#include "refusal.h"
#include "verdict_side.h"

#include <stdexcept>

namespace halfplane {

namespace {

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    detail::refuse<std::invalid_argument>(parts...);
}

} // namespace

nlohmann::json verdict::save() const
{
    nlohmann::json levels = nlohmann::json::array();
    for (const auto& l : d_levels)
        levels.push_back({{"blocks", l.blocks},
                          {"hits", l.hits},
                          {"heavy", l.heavy},
                          {"heavy_pairs", l.heavy_pairs},
                          {"errors", l.errors},
                          {"squares", l.squares},
                          {"products", l.products},
                          {"last", l.last},
                          {"half", l.half},
                          {"waiting", l.waiting},
                          {"pass", l.pass},
                          {"pass_squares", l.pass_squares},
                          {"fail", l.fail},
                          {"fail_squares", l.fail_squares}});
    return {{"target", d_options.target},
            {"confidence", d_options.confidence},
            {"dependence", d_options.dependence},
            {"errors_per_step", d_options.errors_per_step},
            {"max_excluded", d_options.max_excluded},
            {"steps", d_steps},
            {"open_steps", d_open_steps},
            {"open_errors", d_open_errors},
            {"levels", std::move(levels)}};
}

void verdict::restore(const nlohmann::json& saved)
{
    const auto same = [&](const char* field, auto mine) {
        const auto theirs = saved.at(field).get<decltype(mine)>();
        if (theirs != mine)
            refuse("saved verdict: ", field, " is ", theirs, ", expected ", mine);
    };
    verdict fresh(d_options);
    try {
        same("target", d_options.target);
        same("confidence", d_options.confidence);
        same("dependence", d_options.dependence);
        same("errors_per_step", d_options.errors_per_step);
        same("max_excluded", d_options.max_excluded);
        saved.at("steps").get_to(fresh.d_steps);
        saved.at("open_steps").get_to(fresh.d_open_steps);
        saved.at("open_errors").get_to(fresh.d_open_errors);
        if (fresh.d_open_steps >= d_options.dependence)
            refuse("saved verdict: open_steps is ",
                   fresh.d_open_steps,
                   ", must be below ",
                   d_options.dependence);
        for (const auto& each : saved.at("levels")) {
            if (fresh.d_levels.size() == most_verdict_levels)
                refuse("saved verdict: more than ", most_verdict_levels, " levels");
            auto& l = fresh.level_at(fresh.d_levels.size());
            each.at("blocks").get_to(l.blocks);
            each.at("hits").get_to(l.hits);
            each.at("heavy").get_to(l.heavy);
            each.at("heavy_pairs").get_to(l.heavy_pairs);
            each.at("errors").get_to(l.errors);
            each.at("squares").get_to(l.squares);
            each.at("products").get_to(l.products);
            each.at("last").get_to(l.last);
            each.at("half").get_to(l.half);
            each.at("waiting").get_to(l.waiting);
            each.at("pass").get_to(l.pass);
            each.at("pass_squares").get_to(l.pass_squares);
            each.at("fail").get_to(l.fail);
            each.at("fail_squares").get_to(l.fail_squares);
            if (l.pass.size() != d_pass_bets.size() || l.pass_squares.size() != d_pass_bets.size() ||
                l.fail.size() != d_fail_bets.size() || l.fail_squares.size() != d_fail_bets.size() ||
                l.hits > l.blocks)
                refuse(
                    "saved verdict: level ", fresh.d_levels.size() - 1, " does not fit its bets or counts");
        }
    } catch (const nlohmann::json::exception& error) {
        refuse("saved verdict: ", error.what());
    }
    *this = std::move(fresh);
}

} // namespace halfplane
