// SPDX-License-Identifier: GPL-3.0-or-later
// error_tally_impl: drops the delay, hands both streams to the tally, publishes its reports.
#pragma once

#include "halfplane/link/bit_tally.h"

#include <gnuradio/halfplane/error_tally.h>

#include <chrono>
#include <mutex>

namespace gr::halfplane {

class error_tally_impl final : public error_tally
{
public:
    error_tally_impl(::halfplane::link::bit_tally_options options, std::uint64_t delay, std::uint64_t window);

    std::string report() const override;
    bool stop() override;
    void forecast(int noutput_items, gr_vector_int& ninput_items_required) override;
    int general_work(int noutput_items,
                     gr_vector_int& ninput_items,
                     gr_vector_const_void_star& in,
                     gr_vector_void_star& out) override;

private:
    void publish(bool final);

    mutable std::mutex d_mutex; ///< of the tally and the latest report
    ::halfplane::link::bit_tally d_tally;
    const std::uint64_t d_window;
    std::uint64_t d_delay_left;
    std::chrono::steady_clock::time_point d_due{};
    std::string d_latest;
    pmt::pmt_t d_settings;
};

} // namespace gr::halfplane
