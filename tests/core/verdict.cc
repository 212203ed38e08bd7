// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: the wealth from its definition, wrong verdicts in simulated runs with and without bursts, power,
// save and restore to the bit.
#include "halfplane/verdict.h"

#include <gtest/gtest.h>

#include <boost/math/distributions/binomial.hpp>

#include <algorithm>
#include <atomic>
#include <cmath>
#include <cstdio>
#include <random>
#include <string>
#include <thread>
#include <vector>

using namespace halfplane;

namespace {

/// Errors at a rate of their own in good spells, and bursts in which every step errs with a given chance
/// (Gilbert, Bell Syst. Tech. J. 39 (1960) 1253; Elliott, ibid. 42 (1963) 1977). Spells are geometric.
struct channel {
    double rate;             // over all steps
    double burst_length = 0; // mean steps of a burst; 0: independent errors
    double in_burst = 0.5;   // chance of an error in a burst
    double isolated = 0;     // share of the errors that fall outside bursts
};

struct outcome {
    finding state = finding::undecided;
    std::uint64_t steps = 0;
};

/// One run, looked at whenever a block with errors closed and after every clear stretch: nothing changes
/// between but that clear blocks win one way.
outcome play(const verdict_options& options, const channel& link, std::uint64_t horizon, std::uint64_t seed)
{
    std::mt19937_64 random(seed);
    verdict judge(options);
    const bool bursts = link.burst_length > 0;
    const double background = bursts ? link.rate * link.isolated : link.rate;
    const double share_bad = bursts ? link.rate * (1 - link.isolated) / link.in_burst : 0;
    const double mean_gap = bursts ? link.burst_length * (1 - share_bad) / share_bad : 1;
    std::geometric_distribution<std::uint64_t> gap(1 / mean_gap), burst(bursts ? 1 / link.burst_length : 0.5),
        to_error(background > 0 ? background : 0.5);
    std::bernoulli_distribution errs(link.in_burst), starts_bad(share_bad);
    bool bad = starts_bad(random);
    const auto decided = [&] { return judge.state() != finding::undecided; };
    const auto decided_at_close = [&] { return judge.room() == options.dependence && decided(); };
    const auto clear_then_error = [&](std::uint64_t clear, bool error) {
        judge.add(clear, 0);
        if (clear >= options.dependence && decided())
            return true;
        if (!error)
            return false;
        judge.add(1, 1);
        return decided_at_close();
    };
    while (judge.steps() < horizon) {
        auto left = horizon - judge.steps();
        if (bursts)
            left = std::min(left, (bad ? burst(random) : gap(random)) + 1);
        bool stop = false;
        while (left > 0 && !stop) {
            if (bad) {
                judge.add(1, errs(random));
                stop = decided_at_close();
                --left;
                continue;
            }
            const auto clear = background > 0 ? std::min(left, to_error(random)) : left;
            stop = clear_then_error(clear, clear < left);
            left -= clear < left ? clear + 1 : clear;
        }
        if (stop)
            break;
        bad = !bad;
    }
    return {judge.look().state, judge.steps()};
}

struct score {
    unsigned pass = 0, fail = 0;
    std::vector<std::uint64_t> steps; // of decided runs
    std::uint64_t median()
    {
        std::sort(steps.begin(), steps.end());
        return steps[steps.size() / 2];
    }
};

/// The claim is made by the 10,000 runs of an ordinary build. Sanitizers look for errors of memory, which the
/// first few hundred runs would show, and take twenty times as long.
#if defined(__SANITIZE_ADDRESS__) || defined(__SANITIZE_THREAD__)
constexpr unsigned claimed_runs = 300;
#else
constexpr unsigned claimed_runs = 10000;
#endif

score play_all(const verdict_options& options, const channel& link, std::uint64_t horizon, unsigned runs)
{
    std::vector<outcome> all(runs);
    std::atomic<unsigned> next{0};
    const auto work = [&] {
        for (unsigned run; (run = next++) < runs;)
            all[run] = play(options, link, horizon, run + 1);
    };
    std::thread other(work);
    work();
    other.join();
    score s;
    for (const auto& o : all) {
        s.pass += o.state == finding::pass;
        s.fail += o.state == finding::fail;
        if (o.state != finding::undecided)
            s.steps.push_back(o.steps);
    }
    return s;
}

/*!
 * Wrong verdicts among 10,000 runs that are looked at all the time. A method whose chance is exactly α
 * exceeds the limit in one test of a thousand (upper binomial quantile), so a pass states with that
 * confidence that it is not above α.
 */
void expect_few_wrong(const char* name,
                      const verdict_options& options,
                      const channel& link,
                      std::uint64_t horizon)
{
    const double alpha = 1 - options.confidence;
    const auto s = play_all(options, link, horizon, claimed_runs);
    const unsigned wrong =
        link.rate >= options.target ? s.pass + (link.rate == options.target ? s.fail : 0) : s.fail;
    const double limit =
        boost::math::quantile(boost::math::complement(boost::math::binomial(claimed_runs, alpha), 1e-3));
    std::printf("%-52s pass %.4f fail %.4f of %u runs, α = %g\n",
                name,
                static_cast<double>(s.pass) / claimed_runs,
                static_cast<double>(s.fail) / claimed_runs,
                claimed_runs,
                alpha);
    EXPECT_LE(wrong, limit) << name;
}

verdict_options asked(double target, std::uint64_t dependence, double confidence = 0.95)
{
    verdict_options o;
    o.target = target;
    o.dependence = dependence;
    o.confidence = confidence;
    return o;
}

template <typename F>
std::string refusal(F f)
{
    try {
        f();
    } catch (const std::invalid_argument& e) {
        return e.what();
    }
    return "accepted";
}

} // namespace

TEST(Verdict, IndependentErrorsAtTheTarget)
{
    expect_few_wrong("independent errors, blocks of one", asked(1e-4, 1), {1e-4}, 300000);
    expect_few_wrong("independent errors, blocks of 64", asked(1e-3, 64), {1e-3}, 100000);
    expect_few_wrong("independent errors just below", asked(1e-2, 1), {0.99e-2}, 3000);
}

TEST(Verdict, BurstsOf200BitsAtTheTarget)
{
    const auto horizon = [](double p) { return static_cast<std::uint64_t>(2000 / p); };
    expect_few_wrong("bursts of 200 bits", asked(1e-4, 256), {1e-4, 200}, horizon(1e-4));
    expect_few_wrong("bursts of 200 bits, 1e-6", asked(1e-6, 256), {1e-6, 200}, horizon(1e-6));
    expect_few_wrong(
        "bursts of 200 bits, nearly every one wrong", asked(1e-4, 256), {1e-4, 200, 0.95}, horizon(1e-4));
    expect_few_wrong("bursts of 200 bits just above", asked(1e-3, 256), {1.02e-3, 200}, horizon(1e-3));
    expect_few_wrong("bursts of 200 bits just below", asked(1e-3, 256), {0.98e-3, 200}, horizon(1e-3));
    expect_few_wrong(
        "bursts of 200 bits, one error in five isolated", asked(1e-3, 256), {1e-3, 200, 0.5, 0.2}, 300000);
    expect_few_wrong("bursts of 20 bits", asked(1e-3, 256), {1e-3, 20}, 500000);
    expect_few_wrong("bursts of 200 bits, α = 0.01", asked(1e-4, 256, 0.99), {1e-4, 200}, horizon(1e-4));
}

/// At high targets a few blocks decide, long before the dependence of adjacent ones is significant: geometric
/// bursts of this mean do reach into the next block. The height that inflation() adds is what keeps these
/// runs honest.
TEST(Verdict, DenseBurstsAtHighTargets)
{
    expect_few_wrong(
        "target 0.1, bursts of 200, nearly every one wrong", asked(0.1, 256), {0.1, 200, 0.95}, 200000);
    expect_few_wrong(
        "target 0.1, bursts of 200, every second one wrong", asked(0.1, 256), {0.1, 200}, 200000);
    expect_few_wrong("target 0.1, bursts of 200, three errors in ten isolated",
                     asked(0.1, 256),
                     {0.1, 200, 0.7, 0.3},
                     200000);
    expect_few_wrong(
        "target 0.3, bursts of 200, nearly every one wrong", asked(0.3, 256), {0.3, 200, 0.95}, 50000);
    expect_few_wrong(
        "target 0.01, bursts of 200, nearly every one wrong", asked(0.01, 256), {0.01, 200, 0.95}, 500000);
    expect_few_wrong("target 0.1, bursts of 50 in blocks of 64", asked(0.1, 64), {0.1, 50, 0.95}, 100000);
}

TEST(Verdict, StateIsThatOfLookAtEveryStep)
{
    for (const double rate : {0.01, 0.05, 0.1, 0.3}) {
        std::mt19937_64 random(9);
        std::bernoulli_distribution errs(rate);
        verdict judge(asked(0.1, 4));
        for (int k = 0; k < 2000; ++k) {
            ASSERT_EQ(judge.state(), judge.look().state) << k;
            ASSERT_EQ(judge.state(1), judge.look(1).state) << k;
            judge.add(1, errs(random));
        }
    }
}

/// What blocks shorter than the bursts do: the reason for `dependence`. If this ever failed to happen, the
/// tests above would test nothing.
TEST(Verdict, PremiseOfIndependencePassesBadLinksUnderBursts)
{
    const auto s = play_all(asked(1e-4, 1), {1e-4, 200}, 3000000, 1000);
    std::printf("bursts of 200 bits under a premise of independence: pass %.3f\n", s.pass / 1e3);
    EXPECT_GT(s.pass, 500u);
}

TEST(Verdict, DecidesAndHowSoon)
{
    struct row {
        const char* name;
        verdict_options options;
        channel link;
        finding expected;
        double most_errors_worth; // median steps · target
    };
    const row rows[] = {
        {"rate a tenth of the target, independent", asked(1e-4, 1), {1e-5}, finding::pass, 20},
        {"rate half of the target, independent", asked(1e-4, 1), {5e-5}, finding::pass, 50},
        {"rate twice the target, independent", asked(1e-4, 1), {2e-4}, finding::fail, 50},
        {"rate a tenth of the target, blocks of 64", asked(1e-3, 64), {1e-4}, finding::pass, 64 * 6},
        {"rate ten times the target, blocks of 64", asked(1e-3, 64), {1e-2}, finding::fail, 20},
        {"bursts, half of the target", asked(1e-4, 256), {5e-5, 200}, finding::pass, 256 * 500},
        {"bursts, twice the target", asked(1e-4, 256), {2e-4, 200}, finding::fail, 256 * 60},
    };
    for (const auto& r : rows) {
        auto s = play_all(r.options, r.link, static_cast<std::uint64_t>(2e6 / r.options.target), 200);
        const unsigned right = r.expected == finding::pass ? s.pass : s.fail;
        ASSERT_FALSE(s.steps.empty()) << r.name;
        const double worth = static_cast<double>(s.median()) * r.options.target;
        std::printf("%-44s right %u of 200, median %.3g steps = %.3g/target\n",
                    r.name,
                    right,
                    double(s.median()),
                    worth);
        EXPECT_GE(right, 196u) << r.name;
        EXPECT_LE(worth, r.most_errors_worth) << r.name;
    }
}

TEST(Verdict, ErrorFreeRunPassesWhenTheFormulaSays)
{
    for (double p : {1e-2, 1e-5, 1e-9})
        for (std::uint64_t dependence : {1, 64}) {
            // Only the boldest bet counts nearly alone: ln(2/0.64α)/p blocks, less what the smaller ones add.
            verdict judge(asked(p, dependence));
            const auto blocks =
                static_cast<std::uint64_t>(std::log(2 / (0.64 * 0.05)) / std::log1p(0.99 * p / (1 - p)));
            judge.add(blocks * dependence * 9 / 10, 0);
            EXPECT_EQ(judge.look().state, finding::undecided);
            ASSERT_TRUE(judge.steps_to_go());
            const auto go = *judge.steps_to_go();
            judge.add(go, 0);
            EXPECT_EQ(judge.look().state, finding::pass) << p << ' ' << dependence;
            EXPECT_LT(judge.steps(), (blocks + 2) * dependence);
        }
}

/// Wealth from its definition, block by block from plain lists.
TEST(Verdict, WealthEqualsItsDefinition)
{
    const double p = 0.02;
    const std::uint64_t dependence = 8;
    std::mt19937_64 random(3);
    std::bernoulli_distribution errs(0.03);
    for (const std::size_t steps : {128u, 1000u, 5003u}) {
        auto options = asked(p, dependence);
        options.errors_per_step = 2;
        verdict judge(options);
        std::vector<int> y(steps);
        for (auto& e : y) {
            e = errs(random) + errs(random);
            judge.add(1, static_cast<std::uint64_t>(e));
        }
        const auto now = judge.look();
        ASSERT_EQ(now.block, dependence); // independent errors: the shortest
        double pass = 0, fail = 0, left = 1, weight = 0.8;
        for (std::size_t n = dependence; steps / n > 0; n *= 2, left *= 0.2, weight *= 0.2) {
            const auto product = [&](double sign, double bet) {
                double k = 1;
                for (std::size_t b = 0; b + n <= steps; b += n) {
                    double sum = 0;
                    for (std::size_t i = b; i < b + n; ++i)
                        sum += y[i];
                    k *= 1 + sign * bet * (p - sum / static_cast<double>(2 * n));
                }
                return k;
            };
            for (int k = 0; k < 8; ++k)
                pass += weight * (k == 0 ? 0.8 : 0.2 / 7) * product(1, 0.99 / (1 - p) / std::pow(2, k));
            std::vector<double> bets;
            for (double bet = 0.99 / p; bets.empty() || bet > 0.1; bet /= 2)
                bets.push_back(bet);
            for (double bet : bets)
                fail += weight / static_cast<double>(bets.size()) * product(-1, bet);
        }
        EXPECT_NEAR(*now.log_wealth_pass, std::log(pass + left), 1e-9);
        EXPECT_NEAR(*now.log_wealth_fail, std::log(fail + left), 1e-9);
    }
}

TEST(Verdict, PiecesMakeNoDifference)
{
    std::mt19937_64 random(5);
    std::geometric_distribution<std::uint64_t> clear(0.003);
    std::uniform_int_distribution<std::uint64_t> piece(1, 700);
    auto options = asked(1e-3, 32);
    options.errors_per_step = 4;
    verdict whole(options), pieces(options);
    for (int k = 0; k < 3000; ++k) {
        auto run = clear(random);
        const auto errors = 1 + run % 4;
        whole.add(run, 0);
        whole.add(1, errors);
        for (; run > 0;) {
            const auto n = std::min(run, piece(random));
            pieces.add(n, 0);
            run -= n;
        }
        pieces.add(1, errors);
    }
    EXPECT_EQ(whole.save(), pieces.save());
}

TEST(Verdict, SaveAndRestoreToTheBitAtAnyPlace)
{
    std::mt19937_64 random(7);
    std::geometric_distribution<std::uint64_t> clear(0.002);
    verdict through(asked(2e-3, 16)), resumed(asked(2e-3, 16));
    for (int k = 0; k < 2000; ++k) {
        const auto run = clear(random);
        for (auto* v : {&through, &resumed}) {
            v->add(run, 0);
            v->add(1, 1);
        }
        if (k % 37 == 0) {
            verdict next(asked(2e-3, 16));
            next.restore(nlohmann::json::parse(resumed.save().dump())); // through text, as on disk
            resumed = next;
        }
        if (k % 100 == 0) {
            ASSERT_EQ(through.save().dump(), resumed.save().dump());
        }
    }
    EXPECT_EQ(through.look().log_wealth_pass, resumed.look().log_wealth_pass);
    EXPECT_EQ(through.look().log_wealth_fail, resumed.look().log_wealth_fail);
}

TEST(Verdict, BlocksGrowBeyondMeasuredDependence)
{
    verdict judge(asked(1e-3, 16));
    std::mt19937_64 random(11);
    std::bernoulli_distribution errs(0.5);
    for (int burst = 0; burst < 300; ++burst) {
        judge.add(50000, 0);
        for (int k = 0; k < 200; ++k)
            judge.add(1, errs(random));
    }
    const auto now = judge.look();
    std::printf("bursts of 200 steps: blocks of %llu\n", static_cast<unsigned long long>(now.block));
    EXPECT_GE(now.block, 512u);
}

TEST(Verdict, UndecidedWhileDependenceHasNoEnd)
{
    verdict judge(asked(1e-3, 64)); // one half without errors, one with many: nothing escapes that
    judge.add(100000, 0);
    for (int k = 0; k < 2000; ++k) {
        judge.add(49, 0);
        judge.add(1, 1);
    }
    const auto now = judge.look();
    EXPECT_EQ(now.state, finding::undecided);
    EXPECT_EQ(now.block, 0u);
    EXPECT_FALSE(now.log_wealth_pass || now.log_wealth_fail || judge.steps_to_go());
}

TEST(Verdict, ExcludedSymbolsForbidPassing)
{
    verdict judge(asked(1e-2, 1));
    judge.add(999000, 0);
    EXPECT_EQ(judge.look(999).state, finding::pass);
    EXPECT_EQ(judge.look(1000).state, finding::pass); // exactly 0.1 % of 1e6
    EXPECT_EQ(judge.look(1001).state, finding::undecided);
}

TEST(Verdict, FailNeedsErrorsEnoughToSeeDependence)
{
    verdict judge(asked(1e-6, 64));
    judge.add(64 * 32, 0);
    judge.add(64, 60); // wealth enough, but one block is no measurement
    EXPECT_GT(*judge.look().log_wealth_fail, std::log(40));
    EXPECT_EQ(judge.look().state, finding::undecided);
}

TEST(Verdict, StepsToGoIsNearTheMedian)
{
    // Half of the target, a tenth of the way: what is foretold against what happens in 400 runs that go on.
    std::vector<double> foretold, needed;
    for (unsigned run = 0; run < 400; ++run) {
        std::mt19937_64 random(run + 1);
        std::geometric_distribution<std::uint64_t> clear(5e-4);
        verdict judge(asked(1e-3, 1));
        std::uint64_t asked_at = 0;
        while (judge.look().state == finding::undecided && judge.steps() < 10000000) {
            judge.add(clear(random), 0);
            if (judge.look().state != finding::undecided)
                break;
            judge.add(1, 1);
            if (asked_at == 0 && judge.steps() > 8000)
                if (const auto go = judge.steps_to_go()) {
                    asked_at = judge.steps();
                    foretold.push_back(static_cast<double>(*go));
                }
        }
        if (asked_at > 0)
            needed.push_back(static_cast<double>(judge.steps() - asked_at));
    }
    ASSERT_GT(foretold.size(), 100u);
    std::sort(foretold.begin(), foretold.end());
    std::sort(needed.begin(), needed.end());
    const double said = foretold[foretold.size() / 2], was = needed[needed.size() / 2];
    std::printf(
        "steps to go: median foretold %.3g, median needed %.3g (%zu runs)\n", said, was, needed.size());
    EXPECT_GT(said, was / 3);
    EXPECT_LT(said, was * 3);
}

TEST(Verdict, NothingIsForetoldNearTheTarget)
{
    verdict judge(asked(1e-3, 1));
    for (int k = 0; k < 2000; ++k) {
        judge.add(999, 0);
        judge.add(1, 1);
    }
    EXPECT_FALSE(judge.steps_to_go());
}

TEST(Verdict, RefusesAndSaysWhat)
{
    const auto with = [](auto change) {
        auto o = asked(1e-3, 8);
        change(o);
        return refusal([&] { verdict v(o); });
    };
    EXPECT_EQ(with([](auto& o) { o.target = 0; }), "target must lie between 0 and 1, got 0");
    EXPECT_EQ(with([](auto& o) { o.target = std::nan(""); }), "target must lie between 0 and 1, got nan");
    EXPECT_EQ(with([](auto& o) { o.confidence = 1; }), "confidence must lie between 0 and 1, got 1");
    EXPECT_EQ(with([](auto& o) { o.dependence = 0; }), "dependence must be 1 … 2^32 steps, got 0");
    EXPECT_EQ(with([](auto& o) { o.errors_per_step = 0; }), "errors_per_step must be 1 … 2^32, got 0");
    EXPECT_EQ(with([](auto& o) { o.max_excluded = 2; }), "max_excluded must lie in 0 … 1, got 2");
    verdict judge(asked(1e-3, 8));
    EXPECT_EQ(refusal([&] { judge.add(9, 1); }),
              "steps with errors must end within a block: 9 steps, room for 8");
    EXPECT_EQ(refusal([&] { judge.add(2, 3); }), "3 errors in 2 steps of 1");
    auto saved = judge.save();
    verdict other(asked(1e-4, 8));
    EXPECT_EQ(refusal([&] { other.restore(saved); }), "saved verdict: target is 0.001, expected 0.0001");
    saved.erase("levels");
    EXPECT_NE(refusal([&] { judge.restore(saved); }).find("levels"), std::string::npos);
}
