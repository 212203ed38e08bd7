// SPDX-License-Identifier: GPL-3.0-or-later
// watch: the counting half, and the seam between the halves.
#include "halfplane/link/watch.h"

#include "carry_file.h"
#include "halfplane/kernels/detect.h"
#include "reporting.h"
#include "second_clock.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <sstream>
#include <stdexcept>

namespace halfplane::link {

namespace {

using kernels::point_decider;
constexpr std::size_t chunk = 1024;

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    std::ostringstream text;
    text.precision(10);
    (text << ... << parts);
    throw std::invalid_argument(text.str());
}

void check(const watch_options& o)
{
    if (o.window < 1)
        refuse("window must be at least 1 symbol, got ", o.window);
    if (!(o.confidence > 0 && o.confidence < 1))
        refuse("confidence must lie between 0 and 1, got ", o.confidence);
    if (!(o.symbol_rate >= 0 && std::isfinite(o.symbol_rate)))
        refuse("symbol_rate must be a number of Hz, or 0 where unknown, got ", o.symbol_rate);
}

bool same(const input_snr& a, const input_snr& b)
{
    return a.es_n0_db == b.es_n0_db && a.es_n0_db_se == b.es_n0_db_se && a.measured == b.measured;
}

} // namespace

void watch::window::merge(window&& later)
{
    counts.merge(later.counts);
    fit.merge(later.fit);
    residuals.merge(later.residuals);
    blocks = later.blocks;
    seconds = later.seconds;
    trial = std::move(later.trial);
    map_n0 = later.map_n0;
    pending = later.pending;
    if (later.lock)
        lock = later.lock;
    if (later.input)
        input = later.input;
    for (const auto& part : later.inputs)
        if (!inputs.empty() && same(inputs.back().input, part.input)) {
            inputs.back().symbols += part.symbols;
            inputs.back().errors += part.errors;
        } else {
            inputs.push_back(part);
        }
}

struct watch::counting {
    counting(const signal_set& s, const watch_options& o)
        : set(s), receiver_decisions(o.receiver_decisions), window_length(o.window), open(s),
          seconds(o.symbol_rate), on_trial(s, o.trial, o.confidence)
    {
        map = o.rule == detector::map || (o.rule == detector::automatic && !s.uniform());
        if (!receiver_decisions)
            decider.emplace(set);
        if (o.explain)
            residuals.emplace(set);
    }

    void take(const std::complex<float>* in,
              const reference_t* reference,
              const std::uint16_t* received,
              std::size_t n);
    void judge(const std::complex<float>* in,
               const std::uint16_t* sent,
               const std::uint16_t* decided,
               std::size_t n);
    void take_with_exclusions(const std::complex<float>* in,
                              const reference_t* reference,
                              const std::uint16_t* decided,
                              std::size_t n);
    void close(const window_handler& on_window);
    void follow_noise(double n0);
    void take_next_input(const window_handler& on_window);
    void go_on(const reporting& from);

    const signal_set set;
    const bool receiver_decisions;
    const std::uint64_t window_length;
    bool map = false;
    double map_n0 = 0; // what the decider was built for; 0: nearest point
    std::optional<point_decider> decider;
    std::optional<residual_gatherer> residuals;

    window open;
    std::uint64_t in_window = 0, handed = 0, pending = 0;
    block_counts blocks;
    second_clock seconds;
    trial on_trial;
    std::optional<lock_status> lock;
    std::optional<input_snr> input, next_input; // the next takes effect with the next symbol
};

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
        take_with_exclusions(in, reference, decided.data(), n);
    }
    if (residuals)
        residuals->add(in, reference, n);
}

void watch::counting::take_with_exclusions(const std::complex<float>* in,
                                           const reference_t* reference,
                                           const std::uint16_t* decided,
                                           std::size_t n)
{
    const auto size = static_cast<int>(set.size());
    for (std::size_t k = 0; k < n; ++k)
        if (reference[k] >= size || reference[k] < -exclusion_count)
            refuse("reference ",
                   handed + k,
                   " is ",
                   reference[k],
                   ": neither an index of ",
                   size,
                   " points nor an exclusion");
    std::array<std::complex<float>, chunk> samples;
    std::array<std::uint16_t, chunk> sent, taken;
    std::size_t judged = 0;
    for (std::size_t k = 0; k < n; ++k) {
        if (reference[k] < 0) {
            open.counts.count_excluded(static_cast<exclusion>(reference[k]));
            on_trial.left_out(static_cast<std::size_t>(-1 - reference[k]));
        } else if (decided[k] == point_decider::nonfinite) {
            open.counts.count_nonfinite();
            on_trial.left_out(trial::nonfinite);
        } else {
            const auto sent_index = static_cast<std::uint16_t>(reference[k]);
            on_trial.judged(&sent_index, &decided[k], 1);
            samples[judged] = in[k];
            sent[judged] = sent_index;
            taken[judged++] = decided[k];
        }
    }
    judge(samples.data(), sent.data(), taken.data(), judged);
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

watch::watch(const signal_set& set, watch_options options)
{
    check(options);
    d_count = std::make_unique<counting>(set, options);
    d_report = std::make_unique<reporting>(set, options);
    if (const auto carried = read_carry(options.resume))
        restore(*carried);
}

watch::~watch() = default;
watch::watch(watch&&) noexcept = default;

void watch::add(const std::complex<float>* in,
                const reference_t* reference,
                const std::uint16_t* decided,
                std::size_t count,
                const window_handler& on_window)
{
    auto& c = *d_count;
    if (c.receiver_decisions != (decided != nullptr))
        refuse(c.receiver_decisions ? "decisions of the receiver were promised and are missing"
                                    : "decisions were handed in, but `receiver_decisions` is off");
    if (count > 0)
        c.take_next_input(on_window);
    for (std::size_t k = 0; k < count;) {
        const auto n = static_cast<std::size_t>(
            std::min<std::uint64_t>({chunk, count - k, c.window_length - c.in_window, c.seconds.left()}));
        const second_clock::mark before(c.open.counts);
        c.take(in + k, reference + k, decided ? decided + k : nullptr, n);
        c.seconds.add(before, second_clock::mark(c.open.counts), n);
        k += n;
        c.handed += n;
        c.in_window += n;
        if (c.in_window == c.window_length)
            c.close(on_window);
    }
}

void watch::close(const window_handler& on_window, bool even_empty)
{
    auto& c = *d_count;
    if (c.in_window == 0)
        c.take_next_input(on_window);
    if (c.in_window > 0 || even_empty)
        c.close(on_window);
}

void watch::set_lock(const lock_status& status)
{
    d_count->lock = status;
}

void watch::set_input(const input_snr& input)
{
    if (!std::isfinite(input.es_n0_db))
        refuse("es_n0_db at the input must be finite, got ", input.es_n0_db);
    if (!(std::isfinite(input.es_n0_db_se) && input.es_n0_db_se >= 0))
        refuse("es_n0_db_se at the input must be finite and at least 0, got ", input.es_n0_db_se);
    d_count->next_input = input;
}

void watch::set_pending(std::uint64_t pending)
{
    d_count->pending = pending;
}

std::uint64_t watch::handed_in() const noexcept
{
    return d_count->handed;
}

report watch::report_of(window&& w, bool final)
{
    return d_report->report_of(std::move(w), final);
}

nlohmann::json watch::carry() const
{
    return {{"schema", "halfplane/carry/1"},
            {"settings", settings()},
            {"sums", carry_writer::document(*d_report)}};
}

void watch::restore(const nlohmann::json& carried)
{
    refuse_other_settings(carried.at("settings"), settings());
    try {
        carry_reader read(carried);
        read("sums", *d_report);
        d_count->go_on(*d_report);
    } catch (const std::exception& error) {
        refuse("resume: ", error.what());
    }
}

nlohmann::json watch::settings() const
{
    return d_report->settings();
}

} // namespace halfplane::link
