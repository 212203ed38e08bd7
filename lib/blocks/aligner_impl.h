// SPDX-License-Identifier: GPL-3.0-or-later
// aligner_impl: feeds the aligner, tags its outputs, passes on what the radio says of lost samples.
#pragma once

#include "halfplane/link/aligner.h"
#include "rx_time.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/halfplane/aligner.h>

#include <mutex>
#include <vector>

namespace gr::halfplane {

class aligner_impl final : public aligner
{
public:
    aligner_impl(const ::halfplane::signal_set& set,
                 const std::string& pattern,
                 const std::string& correction,
                 std::uint64_t memory,
                 double symbol_rate);

    std::string state() const override;
    std::uint64_t slips() const override;
    void forecast(int noutput_items, gr_vector_int& ninput_items_required) override;
    int general_work(int noutput_items,
                     gr_vector_int& ninput_items,
                     gr_vector_const_void_star& in,
                     gr_vector_void_star& out) override;

private:
    std::vector<std::uint64_t> overflows_before(std::uint64_t end);
    void announce(std::uint64_t first_output);
    int empty_holdback(int room, gr_complex* corrected, ::halfplane::reference_t* reference);

    const ::halfplane::pattern d_pattern;
    ::halfplane::link::aligner d_aligner; ///< used by the block's own thread only
    rx_time d_time;
    bool d_overflow_message = false;
    /// At the end of the input: what was held back, and how much of it has gone out.
    std::vector<gr_complex> d_rest;
    std::vector<::halfplane::reference_t> d_rest_reference;
    std::size_t d_rest_written = 0;
    bool d_ended = false;
    mutable std::mutex d_mutex; ///< guards d_status
    ::halfplane::link::lock_status d_status;
};

} // namespace gr::halfplane
