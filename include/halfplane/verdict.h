// SPDX-License-Identifier: GPL-3.0-or-later
// verdict: whether an error rate keeps a target, by betting; valid at every moment at which one looks.
#pragma once

#include <nlohmann/json.hpp>

#include <array>
#include <cstddef>
#include <cstdint>
#include <optional>
#include <vector>

namespace halfplane {

struct verdict_options {
    double target = 0;        ///< the error rate to be kept, in (0, 1)
    double confidence = 0.95; ///< 1 − α, in (0, 1): the chance of a wrong verdict, ever, is at most α
    /*!
     * Steps (symbols, or frames) over which errors may hang together although no such burst has been seen
     * yet, ≥ 1. This is a premise that no measurement replaces: a link without a single error so far may be
     * one whose bursts are rare. 1 says that errors are independent from step to step.
     */
    std::uint64_t dependence = 1;
    std::uint64_t errors_per_step =
        1;                      ///< most errors of a step, ≥ 1: the bits of a symbol for a target on BER
    double max_excluded = 1e-3; ///< largest share of excluded steps with which `pass` is said, in [0, 1]
};

enum class finding { undecided, pass, fail };
const char* to_string(finding f) noexcept;

/// What can be said now.
struct judgement {
    finding state = finding::undecided;
    /// Natural logarithms of the wealth against "at or above the target" and against "at or below it"; absent
    /// where no block length escapes the dependence.
    std::optional<double> log_wealth_pass, log_wealth_fail;
    std::uint64_t block = 0; ///< steps of the blocks that are bet on, 0 where there is no such length
};

/*!
 * Betting on a bounded mean (Waudby-Smith and Ramdas, "Estimating means of bounded random variables by
 * betting", J. R. Statist. Soc. B 86 (2024) 1; from memory). X_t in [0, 1] is the share of errors in block t.
 * Under "given the past, the error rate is at or above the target p",
 *
 *     K_t = Π (1 + λ (p − X_t)),   0 ≤ λ < 1/(1 − p)
 *
 * is a supermartingale from 1, so that by Ville's inequality it ever reaches 2/α with a chance of at most
 * α/2; where it does, the verdict is `pass`. With X − p and λ < 1/p the opposite holds for `fail`. A mixture
 * over λ is such a wealth, too, and needs no tuning. Looking often costs nothing. The state is that of now: a
 * wealth that falls again takes its verdict back, which makes wrong ones rarer still.
 *
 * Where errors hang together, the statement holds for blocks longer than their dependence only: within a good
 * spell the rate *given the past* is below the target although the link misses it. Blocks of `dependence`
 * steps and of twice, four times … as many are bet on at once, the wealths weighted 0.8·0.2^j (wider blocks
 * need more steps anyway). The shortest length is taken at which adjacent blocks do not err together: no
 * serial correlation above 0.03 (Wald and Wolfowitz, Ann. Math. Statist. 14 (1943) 378; from memory) that a
 * normal or, for rare heavy blocks side by side, a Poisson tail calls significant at 1 %. Shorter lengths
 * lose their say, with all they won. Correlation that may be there
 * and is not significant yet raises the wealth that a verdict needs, from ln(2/α) to ln(2/α)·(1 + 2.5·r) with
 * r the measured one and two standard errors (once two blocks were hit): at targets near 0.1 a few blocks
 * decide, sooner than their dependence shows. Where no length of at least 16 blocks is free, the verdict
 * stays `undecided`; so does a `fail` that rests on fewer than 20 errors in 8 blocks.
 *
 * An error-free run passes after about ln(2/(0.64·α))/p blocks: `dependence` times what independent errors
 * would ask for, and that is the price of not trusting luck.
 */
class verdict
{
public:
    static constexpr std::uint64_t least_blocks = 16;                 ///< of a length before it is heard
    static constexpr std::uint64_t least_errors = 20, least_hits = 8; ///< before `fail`

    /// \throws std::invalid_argument naming the option and its value
    explicit verdict(verdict_options options);

    /// The next `steps` steps held `errors` errors. With errors > 0 the steps must not exceed room().
    /// \throws std::invalid_argument where they do, or where errors exceed steps · errors_per_step
    void add(std::uint64_t steps, std::uint64_t errors);
    /// Steps to the end of the shortest block under way, ≥ 1.
    std::uint64_t room() const noexcept { return d_options.dependence - d_open_steps; }
    std::uint64_t steps() const noexcept { return d_steps; }

    /// \param excluded steps that were left out so far; nonfinite ones are among them
    judgement look(std::uint64_t excluded = 0) const;
    /// look().state at a fraction of the work, for those who ask all the time.
    finding state(std::uint64_t excluded = 0) const;

    const verdict_options& options() const noexcept { return d_options; }

    /*!
     * Median of the steps to go to a verdict, if all goes on as so far: of the first passage of a random walk
     * with the growth and the scatter of the best bet's log-wealth. Absent when decided, where that growth is
     * within twice its standard error of nothing (near the target), and beyond 1e18. A rough
     * figure while errors are few: within a factor of three in the tests.
     */
    std::optional<std::uint64_t> steps_to_go(std::uint64_t excluded = 0) const;

    /// All that restore() needs to go on, to the bit, wherever it was taken.
    nlohmann::json save() const;
    /// \throws std::invalid_argument naming the field that is missing, malformed or differs from options()
    void restore(const nlohmann::json& saved);

private:
    static constexpr std::size_t sizes = 24;
    /// Wealths of one block length. Blocks without errors are only counted: all of them win the same.
    struct level {
        std::uint64_t blocks = 0, hits = 0;
        std::array<std::uint64_t, sizes> heavy{}, heavy_pairs{}; // blocks of ≥ 2^i errors, and two in a row
        double errors = 0, squares = 0, products = 0;            // Σy, Σy², Σy_t y_{t+1}: whole numbers
        double last = 0, half = 0;
        bool waiting = false;                           // half holds a first half
        std::vector<double> pass, fail;                 // Σ ln of the factors of hit blocks, by λ
        std::vector<double> pass_squares, fail_squares; // Σ ln²
    };
    struct side;

    void close_clear(std::size_t at, std::uint64_t blocks);
    void close_hit(std::size_t at, double errors);
    level& level_at(std::size_t at);
    static double correlation(const level& l);
    static bool hangs_together(const level& l);
    static double inflation(const level& l);
    std::optional<std::size_t> free_level() const;
    double wealth_needed(const level& l) const;
    bool forbidden(const level& l, finding kind, std::uint64_t excluded) const;
    double most_wealth(const side& s, std::size_t from) const;
    double log_wealth(const side& s, std::size_t from) const;
    std::optional<double> blocks_to_go(const side& s, std::size_t at) const;
    side passing() const;
    side failing() const;

    verdict_options d_options;
    std::vector<double> d_pass_bets, d_fail_bets;   // λ
    std::vector<double> d_pass_clear, d_fail_clear; // ln of the factor of a block without errors
    std::vector<level> d_levels;
    std::uint64_t d_steps = 0, d_open_steps = 0, d_open_errors = 0;
};

} // namespace halfplane
