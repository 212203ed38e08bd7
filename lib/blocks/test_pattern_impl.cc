// SPDX-License-Identifier: GPL-3.0-or-later
// test_pattern_impl: reads the pattern onward.
#include "test_pattern_impl.h"

#include <gnuradio/io_signature.h>

namespace gr::halfplane {

test_pattern::sptr test_pattern::make(const ::halfplane::signal_set& set, const std::string& pattern)
{
    return gnuradio::make_block_sptr<test_pattern_impl>(set, pattern);
}

test_pattern_impl::test_pattern_impl(const ::halfplane::signal_set& set, const std::string& pattern)
    : gr::sync_block("test_pattern",
                     gr::io_signature::make(0, 0, 0),
                     gr::io_signature::make(1, 1, sizeof(std::int16_t))),
      d_pattern(pattern, set), d_reader(d_pattern)
{
}

int test_pattern_impl::work(int noutput_items, gr_vector_const_void_star&, gr_vector_void_star& out)
{
    // Indices are below 4096: int16 and uint16 hold the same bits.
    d_reader.next(static_cast<std::size_t>(noutput_items), static_cast<std::uint16_t*>(out[0]));
    return noutput_items;
}

} // namespace gr::halfplane
