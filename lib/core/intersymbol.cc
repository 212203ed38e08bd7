// SPDX-License-Identifier: GPL-3.0-or-later
// intersymbol: a choice among combinations of an echo, a timing error and filters, by penalised fit.
#include "intersymbol.h"

#include "pulse_pair.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>

namespace halfplane {

namespace {

constexpr int reach = column::reach;
// 2 numbers and one of eight places; two numbers; four numbers. ln n is about 10 at 1e4 symbols.
constexpr double echo_penalty = 24, timing_penalty = 20, filter_penalty = 40;
// What shapes are trusted to, of the largest tap: pulses are cut off, filters are not quite linear in phase.
constexpr double shape_tolerance = 0.03;
constexpr double most_delay = 0.45;

std::size_t at(int lag)
{
    return column::neighbour(lag) - column::first_neighbour;
}

struct timing {
    double delay = 0, roll_off = 0.35;
    double main() const { return raised_cosine(delay, roll_off); }
    double tap(int lag) const { return raised_cosine(lag - delay, roll_off) / main(); }
};

/// χ² and the explanation of the two taps at ±lag, once the timing's part is taken off.
struct pair_choice {
    double score;
    double even = 0;  // of the filters
    int echo_lag = 0; // 0: none
    complex echo = 0;
};

pair_choice
best_of_pair(int lag, complex later, complex earlier, double w_later, double w_earlier, bool filter)
{
    // w: 1/variance. Each choice leaves a χ² of the complex misfit.
    double even = 0;
    if (filter)
        even = (w_later * later.real() + w_earlier * earlier.real()) / (w_later + w_earlier);
    pair_choice best{w_later * std::norm(later - even) + w_earlier * std::norm(earlier - even), even};
    for (const int side : {1, -1}) {
        const complex mine = side > 0 ? later : earlier, other = side > 0 ? earlier : later;
        const double f = filter ? other.real() : 0;
        const double score = echo_penalty + (side > 0 ? w_earlier : w_later) * std::norm(other - f);
        if (score < best.score)
            best = {score, f, side * lag, mine - f};
    }
    return best;
}

struct explanation {
    double score = std::numeric_limits<double>::infinity();
    bool with_timing = false, with_filter = false;
    timing when;
    std::array<pair_choice, reach> pairs{};
};

class chooser
{
public:
    chooser(const neighbour_taps& taps, const std::array<double, 2 * reach>& variance) : d_taps(taps)
    {
        double largest = 0;
        for (const auto& t : taps)
            largest = std::max(largest, std::norm(t));
        for (std::size_t l = 0; l < taps.size(); ++l)
            d_weight[l] = 1 / (variance[l] + shape_tolerance * shape_tolerance * largest);
    }

    explanation choose() const
    {
        explanation best;
        for (const bool filter : {false, true}) {
            consider(best, std::nullopt, filter);
            // A coarse search over delay and roll-off, then finer steps about the best.
            timing when;
            double least = std::numeric_limits<double>::infinity();
            double delay_step = 0.02, roll_off_step = 0.1;
            for (double a = 0.05; a <= 1; a += roll_off_step)
                for (double t = -most_delay; t <= most_delay; t += delay_step)
                    improve(when, least, {t, a}, filter);
            for (int round = 0; round < 8; ++round) {
                delay_step /= 2;
                roll_off_step /= 2;
                const timing from = when;
                for (const int i : {-2, -1, 0, 1, 2})
                    for (const int j : {-2, -1, 0, 1, 2})
                        improve(when,
                                least,
                                {from.delay + i * delay_step,
                                 std::clamp(from.roll_off + j * roll_off_step, 0.0, 1.0)},
                                filter);
            }
            consider(best, when, filter);
        }
        return best;
    }

private:
    double score(const std::optional<timing>& when, bool filter, std::array<pair_choice, reach>* pairs) const
    {
        double sum = (when ? timing_penalty : 0) + (filter ? filter_penalty : 0);
        for (int lag = 1; lag <= reach; ++lag) {
            complex later = d_taps[at(lag)], earlier = d_taps[at(-lag)];
            if (when) {
                later -= when->tap(lag);
                earlier -= when->tap(-lag);
            }
            const auto found =
                best_of_pair(lag, later, earlier, d_weight[at(lag)], d_weight[at(-lag)], filter);
            sum += found.score;
            if (pairs)
                (*pairs)[static_cast<std::size_t>(lag - 1)] = found;
        }
        return sum;
    }
    void improve(timing& when, double& least, const timing& tried, bool filter) const
    {
        const double s = score(tried, filter, nullptr);
        if (s < least) {
            least = s;
            when = tried;
        }
    }
    void consider(explanation& best, const std::optional<timing>& when, bool filter) const
    {
        explanation tried;
        tried.with_timing = when.has_value();
        tried.with_filter = filter;
        tried.when = when.value_or(timing{});
        tried.score = score(when, filter, &tried.pairs);
        if (tried.score < best.score)
            best = tried;
    }

    const neighbour_taps& d_taps;
    std::array<double, 2 * reach> d_weight;
};

double power(const neighbour_taps& taps)
{
    double sum = 0;
    for (const auto& t : taps)
        sum += std::norm(t);
    return sum;
}

} // namespace

intersymbol_parts split_taps(const neighbour_taps& taps, const std::array<double, 2 * reach>& variance)
{
    intersymbol_parts out;
    const auto best = chooser(taps, variance).choose();
    neighbour_taps rest = taps;
    bool with_echo = false;
    for (int lag = 1; lag <= reach; ++lag) {
        const auto& pair = best.pairs[static_cast<std::size_t>(lag - 1)];
        for (const int place : {lag, -lag}) {
            if (best.with_timing)
                out.timing[at(place)] = best.when.tap(place);
            out.filter[at(place)] = pair.even;
        }
        if (pair.echo_lag != 0) {
            with_echo = true;
            out.echo[at(pair.echo_lag)] = pair.echo;
        }
    }
    for (std::size_t l = 0; l < rest.size(); ++l)
        rest[l] -= out.timing[l] + out.filter[l] + out.echo[l];
    neighbour_taps* owner = &out.filter;
    if (best.with_timing && power(out.timing) >= power(out.filter))
        owner = &out.timing;
    if (with_echo && power(out.echo) > power(*owner))
        owner = &out.echo;
    for (std::size_t l = 0; l < rest.size(); ++l)
        (*owner)[l] += rest[l];
    if (best.with_timing) {
        out.timing_gain = best.when.main();
        out.delay = best.when.delay;
        out.roll_off = best.when.roll_off;
    }
    std::array<double, reach> even;
    for (int lag = 1; lag <= reach; ++lag)
        even[static_cast<std::size_t>(lag - 1)] = (out.filter[at(lag)] + out.filter[at(-lag)]).real() / 2;
    if (power(out.filter) > 0) {
        const auto pair = best.with_filter ? find_pair(even) : std::nullopt;
        out.filter_gain = pair ? (*pair)[0] : 1 / std::sqrt(1 + power(out.filter));
    }
    return out;
}

} // namespace halfplane
