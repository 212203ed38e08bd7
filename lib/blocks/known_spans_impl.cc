// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans_impl: hands samples, and spans from tags and messages, to the delay line; tells what came of
// them.
#include "known_spans_impl.h"

#include "checks.h"
#include "input_ended.h"
#include "lock_pmt.h"
#include "span_pmt.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/io_signature.h>

#include <algorithm>
#include <utility>
#include <vector>

namespace gr::halfplane {
namespace {

using ::halfplane::reference_t;
using core_spans = ::halfplane::link::known_spans;

const pmt::pmt_t& spans_port()
{
    static const pmt::pmt_t port = pmt::mp("spans");
    return port;
}

pmt::pmt_t to_pmt(const ::halfplane::link::span_counts& counts, std::uint64_t refused)
{
    pmt::pmt_t dict = pmt::make_dict();
    for (const auto& [name, count] : {std::pair{"known", counts.known},
                                      {"decoded", counts.decoded},
                                      {"live", counts.live},
                                      {"spans", counts.spans},
                                      {"conflicts", counts.conflicts},
                                      {"late", counts.late},
                                      {"early", counts.early},
                                      {"refused", refused}})
        dict = pmt::dict_add(dict, pmt::mp(name), pmt::from_uint64(count));
    return dict;
}

} // namespace

known_spans::sptr
known_spans::make(const ::halfplane::signal_set& set, std::uint64_t hold_back, const std::string& tag_key)
{
    return gnuradio::make_block_sptr<known_spans_impl>(set, hold_back, tag_key);
}

known_spans_impl::known_spans_impl(const ::halfplane::signal_set& set,
                                   std::uint64_t hold_back,
                                   const std::string& tag_key)
    : gr::block("known_spans",
                gr::io_signature::make(1, 1, sizeof(gr_complex)),
                gr::io_signature::make2(2, 2, sizeof(gr_complex), sizeof(reference_t))),
      d_points(set.size()), d_tag_key(pmt::mp(tag_key)), d_spans(set, hold_back)
{
    if (tag_key.empty())
        refuse_word("known_spans", "tag_key", tag_key, "a name is wanted");
    // Input sample k is output sample k, later: tags keep their offset, but go to output 0 alone.
    set_tag_propagation_policy(TPP_CUSTOM);
    message_port_register_out(spans_port());
    const pmt::pmt_t known = pmt::mp("known");
    message_port_register_in(known);
    // Handlers run in the block's own thread, between calls of general_work().
    set_msg_handler(known, [this](const pmt::pmt_t& message) { take_message(message); });
}

::halfplane::link::span_counts known_spans_impl::counts() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_counts;
}

std::uint64_t known_spans_impl::refused() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_refused;
}

void known_spans_impl::take_message(const pmt::pmt_t& message)
{
    ++d_messages;
    try {
        d_spans.add(span_from_pdu(message, d_points));
    } catch (const std::exception& error) {
        ++d_refusals;
        d_logger->error("message {:d} on `known` is not understood: {:s}", d_messages, error.what());
    }
    keep_counts();
}

/// Spans in the tags below `end`; other tags go on to output 0.
void known_spans_impl::take_tags(std::uint64_t end)
{
    std::vector<gr::tag_t> tags;
    get_tags_in_range(tags, 0, nitems_read(0), end);
    std::stable_sort(tags.begin(), tags.end(), gr::tag_t::offset_compare);
    for (const auto& tag : tags) {
        if (!pmt::eqv(tag.key, d_tag_key)) {
            add_item_tag(0, tag);
            continue;
        }
        try {
            d_spans.add(span_from_tag(tag.offset, tag.value, d_points));
        } catch (const std::exception& error) {
            ++d_refusals;
            d_logger->error("the tag `{:s}` at symbol {:d} is not understood: {:s}",
                            pmt::symbol_to_string(d_tag_key),
                            tag.offset,
                            error.what());
        }
    }
}

void known_spans_impl::tag_pending(std::uint64_t symbols)
{
    for (unsigned port : {0u, 1u})
        add_item_tag(port, nitems_written(0), pending_key(), pmt::from_uint64(symbols));
}

void known_spans_impl::keep_counts()
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    d_counts = d_spans.counts();
    d_refused = d_refusals;
}

/// Says what became of the spans, once a second at most.
void known_spans_impl::tell()
{
    const auto now = std::chrono::steady_clock::now();
    if (now < d_tell_next)
        return;
    d_tell_next = now + std::chrono::seconds(1);
    message_port_pub(spans_port(), to_pmt(d_spans.counts(), d_refusals));
    warn();
}

/// What could not be used since the log last said so.
void known_spans_impl::warn()
{
    const auto& c = d_spans.counts();
    const auto late = c.late - d_warned.late, early = c.early - d_warned.early,
               conflicts = c.conflicts - d_warned.conflicts;
    if (late + early + conflicts == 0)
        return;
    d_warned = c;
    d_logger->warn(
        "of known spans, {:d} symbols came too late for a hold-back of {:d}, {:d} lie too far ahead, "
        "and {:d} spans contradict earlier ones",
        late,
        d_spans.hold_back(),
        early,
        conflicts);
}

bool known_spans_impl::stop()
{
    keep_counts();
    warn();
    return true;
}

void known_spans_impl::forecast(int, gr_vector_int& ninput_items_required)
{
    // Any input is worth taking: at first it fills the hold-back and nothing comes out. Once the input has
    // ended, what is held back comes out without any.
    ninput_items_required[0] = input_ended(*this) ? 0 : 1;
}

int known_spans_impl::general_work(int noutput_items,
                                   gr_vector_int& ninput_items,
                                   gr_vector_const_void_star& in,
                                   gr_vector_void_star& out)
{
    auto* samples = static_cast<gr_complex*>(out[0]);
    auto* reference = static_cast<reference_t*>(out[1]);
    const bool ended = ninput_items[0] == 0 && input_ended(*this);
    std::size_t written = 0;
    if (ended) {
        written = d_spans.finish(static_cast<std::size_t>(noutput_items), samples, reference);
        if (written > 0)
            tag_pending(d_spans.taken() - d_spans.written());
    } else {
        const int taken = std::min(noutput_items, ninput_items[0]);
        take_tags(nitems_read(0) + static_cast<std::uint64_t>(taken));
        written = d_spans.process(
            static_cast<const gr_complex*>(in[0]), static_cast<std::size_t>(taken), samples, reference);
        if (written > 0 && nitems_written(0) == 0)
            tag_pending(d_spans.hold_back());
        consume_each(taken);
    }
    keep_counts();
    tell();
    return ended && written == 0 ? static_cast<int>(WORK_DONE) : static_cast<int>(written);
}

} // namespace gr::halfplane
