// SPDX-License-Identifier: GPL-3.0-or-later
// counting: which symbol goes to which account, and when a window closes.
#include "counting.h"

#include "refuse.h"
#include "reporting.h"

#include <array>
#include <cmath>

namespace halfplane::link {

using kernels::point_decider;

watch::counting::counting(const signal_set& s, const watch_options& o)
    : set(s), receiver_decisions(o.receiver_decisions), window_length(o.window), open(s),
      seconds(o.symbol_rate), on_trial(s, o.trial, o.confidence)
{
    map = o.rule == detector::map || (o.rule == detector::automatic && !s.uniform());
    if (!receiver_decisions)
        decider.emplace(set);
    if (o.explain)
        residuals.emplace(set);
}

/// Counts symbols that are all finite and have a reference each.
void watch::counting::judge(const std::complex<float>* in,
                            const std::uint16_t* sent,
                            const std::uint16_t* decided,
                            std::size_t n)
{
    const auto errors_before = open.counts.symbol_errors;
    open.counts.count(sent, decided, n);
    open.fit.add(in, sent, decided, n, set.points());
    blocks.add(sent, decided, n);
    if (!input || n == 0)
        return;
    if (open.inputs.empty() || !same(open.inputs.back().input, *input))
        open.inputs.push_back({*input, 0, 0});
    open.inputs.back().symbols += n;
    open.inputs.back().errors += open.counts.symbol_errors - errors_before;
}

void watch::counting::take(const std::complex<float>* in,
                           const reference_t* reference,
                           const std::uint16_t* received,
                           std::size_t n)
{
    const auto size = static_cast<int>(set.size());
    std::array<std::uint16_t, chunk> decided;
    if (receiver_decisions) {
        for (std::size_t k = 0; k < n; ++k) {
            const bool finite = std::isfinite(in[k].real()) && std::isfinite(in[k].imag());
            if (received[k] >= size && reference[k] >= 0 && finite)
                refuse("decision ", handed + k, " is ", received[k], ": the set has ", size, " points");
            decided[k] = finite ? received[k] : point_decider::nonfinite;
        }
    } else {
        decider->decide(in, decided.data(), n);
    }

    bool plain = true;
    for (std::size_t k = 0; k < n; ++k)
        plain &= reference[k] >= 0 && reference[k] < size && decided[k] != point_decider::nonfinite;
    if (plain) {
        const auto* sent = reinterpret_cast<const std::uint16_t*>(reference);
        judge(in, sent, decided.data(), n);
        on_trial.judged(sent, decided.data(), n);
    } else {
        check_references(reference, n);
        sort_out(in, reference, decided.data(), n);
    }
    if (residuals)
        explain(in, reference, n);
    open.recent.add(in, reference, n);
}

void watch::counting::check_references(const reference_t* reference, std::size_t n) const
{
    const auto size = static_cast<int>(set.size());
    for (std::size_t k = 0; k < n; ++k) {
        const int index = reference[k] < 0 ? reference[k] : reference[k] & ~decoded_flag;
        if (index >= size || index < live_code)
            refuse("reference ",
                   handed + k,
                   " is ",
                   reference[k],
                   ": neither an index of ",
                   size,
                   " points nor an exclusion, nor live traffic");
    }
}

/// Symbols of every kind, each to its account.
void watch::counting::sort_out(const std::complex<float>* in,
                               const reference_t* reference,
                               const std::uint16_t* decided,
                               std::size_t n)
{
    picked known, by_decoding;
    for (std::size_t k = 0; k < n; ++k) {
        const int code = reference[k];
        if (code == live_code && decided[k] != point_decider::nonfinite) {
            const auto first = k;
            while (k + 1 < n && reference[k + 1] == live_code && decided[k + 1] != point_decider::nonfinite)
                ++k;
            const auto length = k + 1 - first;
            open.counts.live += length;
            open.live.add(in + first, handed + first, length);
            on_trial.left_out(trial::live, length);
        } else if (code < 0 && code != live_code) {
            open.counts.count_excluded(static_cast<exclusion>(code));
            on_trial.left_out(static_cast<std::size_t>(-1 - code));
        } else if (decided[k] == point_decider::nonfinite) {
            open.counts.count_nonfinite();
            on_trial.left_out(trial::nonfinite);
        } else if ((code & decoded_flag) != 0) {
            by_decoding.add(in[k], code & ~decoded_flag, decided[k]);
            on_trial.left_out(trial::live);
        } else {
            known.add(in[k], code, decided[k]);
            on_trial.judged(&known.sent[known.n - 1], &decided[k], 1);
        }
    }
    judge(known.samples.data(), known.sent.data(), known.decided.data(), known.n);
    if (by_decoding.n == 0)
        return;
    const auto& d = by_decoding;
    if (!open.decoded)
        open.decoded.emplace(set);
    open.counts.decoded += d.n;
    open.decoded->count(d.sent.data(), d.decided.data(), d.n);
    open.decoded_fit.add(d.samples.data(), d.sent.data(), d.decided.data(), d.n, set.points());
}

/// Why symbols err is asked of those known in advance alone: that a frame decoded picks among its residuals.
void watch::counting::explain(const std::complex<float>* in, const reference_t* reference, std::size_t n)
{
    std::array<reference_t, chunk> known;
    for (std::size_t k = 0; k < n; ++k)
        known[k] = reference[k] < decoded_flag ? reference[k] : live_code;
    residuals->add(in, known.data(), n);
}

/// A MAP decider for this N0, unless the present one is within 2 % of it: the decisions change by less than
/// the thresholds' own uncertainty.
void watch::counting::follow_noise(double n0)
{
    if (!map || receiver_decisions || !(std::isfinite(n0) && n0 > 0) || std::abs(n0 - map_n0) < 0.02 * map_n0)
        return;
    decider.emplace(set, n0);
    map_n0 = n0;
}

void watch::counting::close(const window_handler& on_window)
{
    open.blocks = blocks;
    open.seconds = seconds.counts();
    open.trial = on_trial.state();
    open.lock = lock;
    open.pending = pending;
    if (residuals)
        open.residuals = residuals->take();
    open.input = input;
    if (map)
        if (const auto fit = open.fit.solve(set))
            follow_noise(fit->n0);
    open.map_n0 = map_n0;
    window done(set);
    std::swap(done, open);
    open.first_symbol = handed;
    in_window = 0;
    on_window(std::move(done));
}

void watch::counting::take_next_input(const window_handler& on_window)
{
    if (!next_input)
        return;
    if (in_window > 0 && !next_input->measured && !(input && same(*input, *next_input)))
        close(on_window);
    input = next_input;
    next_input.reset();
    if (map_n0 == 0)
        follow_noise(set.es() / from_db(input->es_n0_db));
}

/// From where the totals of an earlier run stand.
void watch::counting::go_on(const reporting& from)
{
    blocks = from.d_run.blocks;
    seconds.go_on(from.d_run.seconds);
    on_trial.go_on(from.d_run.trial);
    handed = open.first_symbol = from.d_counts.accounted();
    follow_noise(from.d_run.map_n0);
}

} // namespace halfplane::link
