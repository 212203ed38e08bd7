// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge_impl: hands samples to the gauge and its readings to the message port.
#pragma once

#include "halfplane/link/input_gauge.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/halfplane/input_gauge.h>

#include <mutex>

namespace gr::halfplane {

class input_gauge_impl final : public input_gauge
{
public:
    input_gauge_impl(const ::halfplane::link::input_gauge_options& options, double interval);

    void set_transmitter(bool on) override;
    std::string reading() const override;
    std::uint64_t nonfinite() const override;
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    void take(const gr_complex* in, std::size_t n);
    void turn(bool on);
    void turn(const pmt::pmt_t& word, const std::string& where);
    void publish();

    const std::uint64_t d_interval; ///< samples
    const bool d_needs_quiet;
    mutable std::mutex d_lock; ///< of everything below
    ::halfplane::link::input_gauge d_gauge;
    bool d_on = true;
    std::uint64_t d_taken = 0; ///< samples with the transmitter on since the last message
    std::string d_reading;
    bool d_told = false; ///< that there is nothing to say
};

} // namespace gr::halfplane
