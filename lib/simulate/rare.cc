// SPDX-License-Identifier: GPL-3.0-or-later
// rare: importance sampling of error rates.
#include "halfplane/kernels/noise.h"
#include "halfplane/kernels/random_words.h"
#include "halfplane/simulate.h"
#include "link_model.h"
#include "ordered_work.h"
#include "shift_mixture.h"
#include "streams.h"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <stdexcept>
#include <string>
#include <thread>

namespace halfplane {

namespace {

constexpr std::uint64_t run_length = 16384;           // draws
constexpr std::uint64_t pilot_draws = 4 * run_length; // at first; more where they hold no error
constexpr std::uint64_t main_start = std::uint64_t{1} << 40;
constexpr double spare = 1.2; // the pilot's variance is itself an estimate

/// Weights of the errors: Σw, Σw² for symbols, and for the part of the bits that is wrong.
struct weight_sums {
    double draws = 0, symbol = 0, symbol_squared = 0, bit = 0, bit_squared = 0;

    void add(const weight_sums& other)
    {
        draws += other.draws;
        symbol += other.symbol, symbol_squared += other.symbol_squared;
        bit += other.bit, bit_squared += other.bit_squared;
    }
    static rare_rate rate(double draws, double sum, double squares)
    {
        if (draws < 2)
            return {0, 0};
        const double mean = sum / draws;
        return {mean, std::sqrt(std::max(0.0, squares / draws - mean * mean) / (draws - 1))};
    }
    rare_rate ser() const { return rate(draws, symbol, symbol_squared); }
    rare_rate ber() const { return rate(draws, bit, bit_squared); }
};

weight_sums
draw_run(const link_model& link, const shift_mixture& mixture, std::uint64_t seed, std::uint64_t first)
{
    constexpr std::size_t block = link_model::block;
    std::vector<std::complex<float>> normal(block), received(block);
    std::vector<std::uint32_t> word(2 * block);
    std::vector<const shift_mixture::component*> from(block);
    std::vector<complex> noise(block);
    std::vector<std::uint16_t> decided(block);
    const signal_set& set = link.set();
    weight_sums sums;
    for (std::uint64_t at = first; at < first + run_length; at += block) {
        kernels::random_words(seed, streams::mixture).draw(2 * at, 2 * block, word.data());
        kernels::complex_noise(seed, streams::noise).draw(at, block, 1.0, normal.data());
        for (std::size_t k = 0; k < block; ++k) {
            const std::uint64_t bits = (std::uint64_t{word[2 * k]} << 32 | word[2 * k + 1]) >> 11;
            from[k] = &mixture.pick(static_cast<double>(bits) * 0x1p-53);
            noise[k] = from[k]->shift + std::sqrt(from[k]->n0) * complex(normal[k]);
            received[k] = std::complex<float>(link.means()[from[k]->point] + noise[k]);
        }
        link.decider().decide(received.data(), decided.data(), block);
        for (std::size_t k = 0; k < block; ++k) {
            if (decided[k] == from[k]->point || decided[k] == kernels::point_decider::nonfinite)
                continue;
            const double weight = mixture.weight(*from[k], noise[k]);
            const double part = weight *
                                label_distance(set.labels()[decided[k]], set.labels()[from[k]->point]) /
                                set.label_bits();
            sums.symbol += weight, sums.symbol_squared += weight * weight;
            sums.bit += part, sums.bit_squared += part * part;
        }
        sums.draws += static_cast<double>(block);
    }
    return sums;
}

} // namespace

rare_simulation simulate_rare(const signal_set& set,
                              const simulation_options& options,
                              double relative_error,
                              const rare_progress_callback& progress)
{
    if (!(relative_error > 0 && relative_error < 1))
        throw std::invalid_argument("simulate: relative_error must be between 0 and 1, not " +
                                    std::to_string(relative_error));
    const link_model link(set, options);
    std::vector<channel_state> states = options.channel->states();
    if (states.empty())
        throw std::invalid_argument(
            "simulate: the gain of law \"" + options.channel->name() +
            "\" varies continuously; its errors come from deep fades and are frequent enough "
            "to be counted plainly");
    if (link.fading() && link.map_rule())
        throw std::invalid_argument(
            "simulate: rare errors of a MAP detector need a law of one state, not \"" +
            options.channel->name() + "\"");
    const shift_mixture mixture(link, states);
    const auto start = std::chrono::steady_clock::now();
    const auto seconds = [&] {
        return std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
    };
    const unsigned threads =
        options.threads ? options.threads : std::max(1u, std::thread::hardware_concurrency());

    weight_sums sums;
    std::uint64_t runs = 0;
    bool willing = true;
    const auto draw = [&](std::uint64_t from) {
        sums = {};
        willing = run_in_order<weight_sums>(
            threads,
            runs,
            [&](std::uint64_t run) { return draw_run(link, mixture, options.seed, from + run * run_length); },
            [&](weight_sums&& more) {
                sums.add(more);
                return true;
            },
            [&] {
                const double done = sums.draws / static_cast<double>(runs * run_length);
                return !progress || progress(seconds(), from >= main_start ? done : 0);
            });
    };
    const std::uint64_t most = std::max<std::uint64_t>(1, options.max_symbols / run_length);
    std::uint64_t from = 0;
    for (runs = std::min(most, pilot_draws / run_length);; runs = std::min(most, 4 * runs)) {
        draw(from);
        from += runs * run_length;
        if (sums.symbol > 0 || runs == most || !willing)
            break;
    }
    if (willing && sums.symbol > 0) {
        const rare_rate pilot = sums.ser();
        const double needed = spare * sums.draws *
                              std::pow(pilot.standard_error / pilot.value / relative_error, 2) / run_length;
        runs = static_cast<std::uint64_t>(std::clamp(std::ceil(needed), 1.0, static_cast<double>(most)));
        draw(main_start);
    }
    const auto in_full = [&](rare_rate r) {
        return rare_rate{r.value * mixture.unit(), r.standard_error * mixture.unit()};
    };
    return {in_full(sums.ser()),
            in_full(sums.ber()),
            static_cast<std::uint64_t>(sums.draws),
            seconds(),
            !willing};
}

} // namespace halfplane
