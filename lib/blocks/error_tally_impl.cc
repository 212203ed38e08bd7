// SPDX-License-Identifier: GPL-3.0-or-later
// error_tally_impl: drops the delay, hands both streams to the tally, publishes its reports.
#include "error_tally_impl.h"

#include "checks.h"

#include <gnuradio/halfplane/report_pmt.h>
#include <gnuradio/io_signature.h>

#include <algorithm>

namespace gr::halfplane {
namespace {

constexpr std::chrono::milliseconds least_interval{100};

const pmt::pmt_t& report_port()
{
    static const pmt::pmt_t port = pmt::mp("report");
    return port;
}

} // namespace

error_tally::sptr error_tally::make(bool packed,
                                    std::uint64_t frame_bits,
                                    const std::string& target,
                                    std::uint64_t delay,
                                    std::uint64_t window,
                                    double confidence,
                                    double max_excluded)
{
    ::halfplane::link::bit_tally_options options;
    options.packed = packed;
    options.frame_bits = frame_bits;
    options.target = target;
    options.confidence = confidence;
    options.max_excluded = max_excluded;
    checked("error_tally", "window", window, window >= 1, "at least 1 bit is wanted");
    return gnuradio::make_block_sptr<error_tally_impl>(std::move(options), delay, window);
}

error_tally_impl::error_tally_impl(::halfplane::link::bit_tally_options options,
                                   std::uint64_t delay,
                                   std::uint64_t window)
    : gr::block("error_tally", gr::io_signature::make(2, 2, 1), gr::io_signature::make(0, 0, 0)),
      d_tally(std::move(options)), d_window(window), d_delay_left(delay),
      d_settings(json_to_pmt(d_tally.settings()))
{
    message_port_register_out(report_port());
}

std::string error_tally_impl::report() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_latest;
}

/// Under the lock.
void error_tally_impl::publish(bool final)
{
    static const pmt::pmt_t settings = pmt::mp("settings");
    const auto made = d_tally.make_report(final);
    d_latest = made.dump();
    message_port_pub(report_port(), pmt::dict_add(json_to_pmt(made), settings, d_settings));
}

bool error_tally_impl::stop()
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    publish(true);
    return true;
}

/// While the delay is dropped, input 0 may have nothing.
void error_tally_impl::forecast(int, gr_vector_int& ninput_items_required)
{
    ninput_items_required = {d_delay_left > 0 ? 0 : 1, 1};
}

int error_tally_impl::general_work(int,
                                   gr_vector_int& ninput_items,
                                   gr_vector_const_void_star& in,
                                   gr_vector_void_star&)
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    const auto early = std::min<std::uint64_t>(d_delay_left, static_cast<std::uint64_t>(ninput_items[1]));
    d_tally.skip(early);
    d_delay_left -= early;
    const auto n = std::min(static_cast<std::uint64_t>(ninput_items[0]),
                            static_cast<std::uint64_t>(ninput_items[1]) - early);
    d_tally.add(static_cast<const std::uint8_t*>(in[0]), static_cast<const std::uint8_t*>(in[1]) + early, n);
    consume(0, static_cast<int>(n));
    consume(1, static_cast<int>(early + n));
    if (d_tally.bits_in_window() >= d_window && std::chrono::steady_clock::now() >= d_due) {
        d_due = std::chrono::steady_clock::now() + least_interval;
        publish(false);
    }
    return 0;
}

} // namespace gr::halfplane
