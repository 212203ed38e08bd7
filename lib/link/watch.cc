// SPDX-License-Identifier: GPL-3.0-or-later
// watch: the seam between the halves.
#include "halfplane/link/watch.h"

#include "carry_file.h"
#include "counting.h"
#include "refuse.h"
#include "reporting.h"

#include <algorithm>
#include <cmath>

namespace halfplane::link {

namespace {

void check(const watch_options& o)
{
    if (o.window < 1)
        refuse("window must be at least 1 symbol, got ", o.window);
    if (!(o.confidence > 0 && o.confidence < 1))
        refuse("confidence must lie between 0 and 1, got ", o.confidence);
    if (!(o.symbol_rate >= 0 && std::isfinite(o.symbol_rate)))
        refuse("symbol_rate must be a number of Hz, or 0 where unknown, got ", o.symbol_rate);
}

} // namespace

void watch::window::merge(window&& later)
{
    counts.merge(later.counts);
    fit.merge(later.fit);
    residuals.merge(later.residuals);
    recent.merge(later.recent);
    if (!decoded)
        decoded = std::move(later.decoded);
    else if (later.decoded)
        decoded->merge(*later.decoded);
    decoded_fit.merge(later.decoded_fit);
    live.merge(later.live);
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
        const auto n = static_cast<std::size_t>(std::min<std::uint64_t>(
            {counting::chunk, count - k, c.window_length - c.in_window, c.seconds.left()}));
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
