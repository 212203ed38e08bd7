// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge_impl: hands samples to the gauge and its readings to the message port.
#include "input_gauge_impl.h"

#include "checks.h"

#include <gnuradio/halfplane/report_pmt.h>
#include <gnuradio/io_signature.h>

#include <algorithm>
#include <cmath>

namespace gr::halfplane {
namespace {

const pmt::pmt_t& input_port()
{
    static const pmt::pmt_t port = pmt::mp("input");
    return port;
}

const pmt::pmt_t& transmitter_key()
{
    static const pmt::pmt_t key = pmt::mp("transmitter");
    return key;
}

::halfplane::link::frequency_band band_of(const char* name, const std::vector<double>& ends)
{
    checked(
        "input_gauge", name, ends.size(), ends.size() == 2, "numbers in it; low and high in Hz are wanted");
    return {ends[0], ends[1]};
}

} // namespace

input_gauge::sptr input_gauge::make(double sample_rate,
                                    double symbol_rate,
                                    const std::vector<double>& band,
                                    const std::vector<double>& noise_band,
                                    double interval,
                                    std::size_t segments)
{
    checked("input_gauge",
            "interval",
            interval,
            std::isfinite(interval) && interval > 0,
            "seconds > 0 are wanted");
    checked("input_gauge",
            "segments",
            segments,
            segments >= ::halfplane::link::input_gauge::least_segments,
            "at least 64 are wanted");
    ::halfplane::link::input_gauge_options options{
        sample_rate, symbol_rate, band_of("band", band), std::nullopt, 0};
    if (!noise_band.empty())
        options.noise_band = band_of("noise_band", noise_band);
    try {
        // Half overlapped where samples are few, else only as many segments as were asked for.
        const auto half = ::halfplane::link::input_gauge(options).segment() / 2;
        options.hop =
            std::max(half, static_cast<std::size_t>(interval * sample_rate / static_cast<double>(segments)));
        return gnuradio::make_block_sptr<input_gauge_impl>(options, interval);
    } catch (const std::invalid_argument& error) {
        throw std::invalid_argument(std::string("input_gauge: ") + error.what());
    }
}

input_gauge_impl::input_gauge_impl(const ::halfplane::link::input_gauge_options& options, double interval)
    : gr::sync_block(
          "input_gauge", gr::io_signature::make(1, 1, sizeof(gr_complex)), gr::io_signature::make(0, 0, 0)),
      d_interval(std::max<std::uint64_t>(
          1, static_cast<std::uint64_t>(std::llround(interval * options.sample_rate)))),
      d_needs_quiet(!options.noise_band), d_gauge(options)
{
    message_port_register_out(input_port());
    message_port_register_in(transmitter_key());
    set_msg_handler(transmitter_key(), [this](const pmt::pmt_t& message) { turn(message, "a message"); });
}

void input_gauge_impl::set_transmitter(bool on)
{
    const std::lock_guard held(d_lock);
    turn(on);
}

/// Under the lock. What was learned of the noise before is worth no more when a new quiet stretch begins.
void input_gauge_impl::turn(bool on)
{
    if (on == d_on)
        return;
    d_on = on;
    if (!on && d_needs_quiet)
        d_gauge.restart_quiet();
}

void input_gauge_impl::turn(const pmt::pmt_t& word, const std::string& where)
{
    const bool is_word = pmt::is_symbol(word);
    if (pmt::is_bool(word))
        set_transmitter(pmt::to_bool(word));
    else if (is_word && pmt::symbol_to_string(word) == "on")
        set_transmitter(true);
    else if (is_word && pmt::symbol_to_string(word) == "off")
        set_transmitter(false);
    else
        d_logger->error(
            "{:s} for `transmitter` is {:s}; one of on, off is wanted", where, pmt::write_string(word));
}

std::string input_gauge_impl::reading() const
{
    const std::lock_guard held(d_lock);
    return d_reading;
}

std::uint64_t input_gauge_impl::nonfinite() const
{
    const std::lock_guard held(d_lock);
    return d_gauge.nonfinite();
}

/// Under the lock.
void input_gauge_impl::publish()
{
    if (const auto got = d_gauge.read()) {
        const nlohmann::ordered_json message{{"es_n0_db", got->es_n0_db},
                                             {"es_n0_db_se", got->es_n0_db_se},
                                             {"source", "measured"},
                                             {"segments", got->segments},
                                             {"nonfinite", d_gauge.nonfinite()}};
        d_reading = message.dump();
        d_told = false;
        message_port_pub(input_port(), json_to_pmt(message));
    } else if (!d_told) {
        d_told = true; // once, until there is something again
        d_logger->warn(
            "no reading: {:s}",
            d_needs_quiet
                ? "no stretch with the transmitter off was long enough yet, or nothing stands above it"
                : "too few segments in an interval, or nothing stands above the noise");
    }
    d_gauge.restart();
}

void input_gauge_impl::take(const gr_complex* in, std::size_t n)
{
    const std::lock_guard held(d_lock);
    while (n > 0) {
        const auto part =
            d_on ? static_cast<std::size_t>(std::min<std::uint64_t>(n, d_interval - d_taken)) : n;
        d_gauge.add(in, part, d_on);
        in += part;
        n -= part;
        if (d_on && (d_taken += part) == d_interval) {
            d_taken = 0;
            publish();
        }
    }
}

int input_gauge_impl::work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star&)
{
    const auto* samples = static_cast<const gr_complex*>(in[0]);
    const std::uint64_t first = nitems_read(0);
    std::vector<gr::tag_t> tags;
    get_tags_in_window(tags, 0, 0, static_cast<std::uint64_t>(noutput_items), transmitter_key());
    std::sort(tags.begin(), tags.end(), gr::tag_t::offset_compare);
    std::size_t position = 0;
    for (const auto& tag : tags) {
        const auto at = static_cast<std::size_t>(tag.offset - first);
        take(samples + position, at - position);
        position = at;
        turn(tag.value, "a tag at sample " + std::to_string(tag.offset));
    }
    take(samples + position, static_cast<std::size_t>(noutput_items) - position);
    return noutput_items;
}

} // namespace gr::halfplane
