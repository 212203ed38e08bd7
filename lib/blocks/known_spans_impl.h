// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans_impl: hands samples, and spans from tags and messages, to the delay line; tells what came of
// them.
#pragma once

#include "halfplane/link/known_spans.h"

#include <gnuradio/halfplane/known_spans.h>
#include <gnuradio/tags.h>

#include <chrono>
#include <mutex>

namespace gr::halfplane {

class known_spans_impl final : public known_spans
{
public:
    known_spans_impl(const ::halfplane::signal_set& set, std::uint64_t hold_back, const std::string& tag_key);

    std::uint64_t hold_back() const override { return d_spans.hold_back(); }
    ::halfplane::link::span_counts counts() const override;
    std::uint64_t refused() const override;
    bool stop() override;
    void forecast(int noutput_items, gr_vector_int& ninput_items_required) override;
    int general_work(int noutput_items,
                     gr_vector_int& ninput_items,
                     gr_vector_const_void_star& in,
                     gr_vector_void_star& out) override;

private:
    void take_message(const pmt::pmt_t& message);
    void take_tags(std::uint64_t end);
    void tag_pending(std::uint64_t symbols);
    void keep_counts();
    void tell();
    void warn();

    const std::size_t d_points;
    const pmt::pmt_t d_tag_key;
    ::halfplane::link::known_spans d_spans; ///< used by the block's own thread only
    std::uint64_t d_messages = 0;
    std::uint64_t d_refusals = 0;
    ::halfplane::link::span_counts d_warned; ///< what the log has said so far
    std::chrono::steady_clock::time_point d_tell_next;
    mutable std::mutex d_mutex; ///< guards the two below
    ::halfplane::link::span_counts d_counts;
    std::uint64_t d_refused = 0;
};

} // namespace gr::halfplane
