// SPDX-License-Identifier: GPL-3.0-or-later
// aligner_impl: feeds the aligner, tags its outputs, passes on what the radio says of lost samples.
#include "aligner_impl.h"

#include "checks.h"
#include "input_ended.h"
#include "lock_pmt.h"

#include <gnuradio/io_signature.h>

#include <algorithm>
#include <cmath>

namespace gr::halfplane {
namespace {

using ::halfplane::reference_t;
using core_aligner = ::halfplane::link::aligner;

::halfplane::link::aligner_options options_of(const std::string& correction, std::uint64_t memory)
{
    ::halfplane::link::aligner_options options;
    if (correction == "running")
        options.mode = ::halfplane::link::correction::running;
    else if (correction == "held")
        options.mode = ::halfplane::link::correction::held;
    else if (correction == "off")
        options.mode = ::halfplane::link::correction::off;
    else
        refuse_word("aligner", "correction", correction, "one of running, held, off is wanted");
    options.memory = checked("aligner", "memory", memory, memory >= 16, "at least 16 symbols are wanted");
    return options;
}

} // namespace

aligner::sptr aligner::make(const ::halfplane::signal_set& set,
                            const std::string& pattern,
                            const std::string& correction,
                            std::uint64_t memory,
                            double symbol_rate)
{
    return gnuradio::make_block_sptr<aligner_impl>(set, pattern, correction, memory, symbol_rate);
}

std::uint64_t aligner::holdback()
{
    return core_aligner::holdback;
}

aligner_impl::aligner_impl(const ::halfplane::signal_set& set,
                           const std::string& pattern,
                           const std::string& correction,
                           std::uint64_t memory,
                           double symbol_rate)
    : gr::block("aligner",
                gr::io_signature::make(1, 1, sizeof(gr_complex)),
                gr::io_signature::make2(2, 2, sizeof(gr_complex), sizeof(reference_t))),
      d_pattern(pattern, set), d_aligner(set, d_pattern, options_of(correction, memory)),
      d_time(checked("aligner",
                     "symbol_rate",
                     symbol_rate,
                     std::isfinite(symbol_rate) && symbol_rate >= 0,
                     "a finite number ≥ 0 is wanted"))
{
    // Input sample k is output sample k, later: tags keep their offset, but go to output 0 alone.
    set_tag_propagation_policy(TPP_CUSTOM);
    message_port_register_out(lock_key());
    const pmt::pmt_t overflow = pmt::mp("overflow");
    message_port_register_in(overflow);
    // Handlers run in the block's own thread, between calls of general_work().
    set_msg_handler(overflow, [this](const pmt::pmt_t&) { d_overflow_message = true; });
}

std::string aligner_impl::state() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return to_string(d_status.state);
}

std::uint64_t aligner_impl::slips() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_status.slips;
}

void aligner_impl::forecast(int, gr_vector_int& ninput_items_required)
{
    // Any input is worth taking: at first it fills the hold-back and nothing comes out. Once the input has
    // ended, what is held back comes out without any.
    ninput_items_required[0] = input_ended(*this) ? 0 : 1;
}

/// What was held back when the input ended, as far as there is room.
int aligner_impl::empty_holdback(int room, gr_complex* corrected, reference_t* reference)
{
    const std::uint64_t first_output = nitems_written(0);
    if (!d_ended) {
        d_ended = true;
        const auto held = static_cast<std::size_t>(d_aligner.taken() - d_aligner.written());
        d_rest.resize(held);
        d_rest_reference.resize(held);
        d_aligner.finish(d_rest.data(), d_rest_reference.data());
        announce(first_output);
    }
    const std::size_t count = std::min(static_cast<std::size_t>(room), d_rest.size() - d_rest_written);
    if (count == 0)
        return WORK_DONE;
    const auto begin = static_cast<std::ptrdiff_t>(d_rest_written),
               end = begin + static_cast<std::ptrdiff_t>(count);
    std::copy(d_rest.begin() + begin, d_rest.begin() + end, corrected);
    std::copy(d_rest_reference.begin() + begin, d_rest_reference.begin() + end, reference);
    d_rest_written += count;
    for (unsigned port : {0u, 1u})
        add_item_tag(port, first_output, pending_key(), pmt::from_uint64(d_rest.size() - d_rest_written));
    return static_cast<int>(count);
}

/// Offsets below `end` before which samples are missing, ascending; other tags go on to output 0.
std::vector<std::uint64_t> aligner_impl::overflows_before(std::uint64_t end)
{
    static const pmt::pmt_t rx_time_key = pmt::mp("rx_time");
    std::vector<gr::tag_t> tags;
    get_tags_in_range(tags, 0, nitems_read(0), end);
    std::sort(tags.begin(), tags.end(), gr::tag_t::offset_compare);
    std::vector<std::uint64_t> overflows;
    if (d_overflow_message)
        overflows.push_back(nitems_read(0));
    d_overflow_message = false;
    for (const auto& tag : tags) {
        add_item_tag(0, tag);
        if (pmt::eqv(tag.key, rx_time_key) && d_time.jumped(tag.offset, tag.value))
            overflows.push_back(tag.offset);
    }
    return overflows;
}

/// Tags and messages for what has changed since the last call.
void aligner_impl::announce(std::uint64_t first_output)
{
    for (const auto& event : d_aligner.take_events()) {
        const std::uint64_t offset = std::max(event.symbol, first_output);
        const pmt::pmt_t status = lock_to_pmt(event.status);
        add_item_tag(0, offset, lock_key(), status);
        add_item_tag(1, offset, lock_key(), status);
        message_port_pub(lock_key(), pmt::dict_add(status, pmt::mp("symbol"), pmt::from_uint64(offset)));
    }
    const std::lock_guard<std::mutex> lock(d_mutex);
    d_status = d_aligner.status();
}

int aligner_impl::general_work(int noutput_items,
                               gr_vector_int& ninput_items,
                               gr_vector_const_void_star& in,
                               gr_vector_void_star& out)
{
    const auto* samples = static_cast<const gr_complex*>(in[0]);
    auto* corrected = static_cast<gr_complex*>(out[0]);
    auto* reference = static_cast<reference_t*>(out[1]);
    if (d_ended || (ninput_items[0] == 0 && input_ended(*this)))
        return empty_holdback(noutput_items, corrected, reference);
    const auto taken = static_cast<std::uint64_t>(std::min(noutput_items, ninput_items[0]));
    const std::uint64_t first = nitems_read(0), end = first + taken, first_output = nitems_written(0);

    std::size_t written = 0;
    std::uint64_t position = first;
    const auto feed_until = [&](std::uint64_t stop) {
        const auto count = static_cast<std::size_t>(stop - position);
        written +=
            d_aligner.process(samples + (position - first), count, corrected + written, reference + written);
        position = stop;
    };
    for (const std::uint64_t overflow : overflows_before(end)) {
        feed_until(overflow);
        d_aligner.mark_overflow();
    }
    feed_until(end);

    if (first_output == 0 && written > 0)
        for (unsigned port : {0u, 1u})
            add_item_tag(port, 0, pending_key(), pmt::from_uint64(core_aligner::holdback));
    announce(first_output);
    consume_each(static_cast<int>(taken));
    return static_cast<int>(written);
}

} // namespace gr::halfplane
