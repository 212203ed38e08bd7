// SPDX-License-Identifier: GPL-3.0-or-later
// link_watch_impl: hands symbols and what is known of them to the reporter, and its reports to the message
// port.
#pragma once

#include "halfplane/link/reporter.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/halfplane/link_watch.h>

#include <chrono>

namespace gr::halfplane {

class link_watch_impl final : public link_watch
{
public:
    link_watch_impl(const ::halfplane::signal_set& set,
                    const std::string& pattern,
                    std::uint64_t window,
                    double confidence,
                    double symbol_rate,
                    const std::string& decisions,
                    const std::string& target,
                    std::uint64_t frame_symbols,
                    double max_excluded,
                    const std::string& resume,
                    bool explain);
    ~link_watch_impl() override;

    std::string report() const override;
    bool start() override;
    bool stop() override;
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    void publish(const ::halfplane::link::report& made);
    void take_input(const pmt::pmt_t& message);
    void take_tag(const gr::tag_t& tag);

    std::chrono::steady_clock::time_point d_carry_due{};
    pmt::pmt_t d_settings;                  ///< made once, a part of every message
    ::halfplane::link::reporter d_reporter; ///< locks for itself
};

} // namespace gr::halfplane
