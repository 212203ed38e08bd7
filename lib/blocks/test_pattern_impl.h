// SPDX-License-Identifier: GPL-3.0-or-later
// test_pattern_impl: reads the pattern onward.
#pragma once

#include "halfplane/pattern.h"

#include <gnuradio/halfplane/test_pattern.h>

namespace gr::halfplane {

class test_pattern_impl final : public test_pattern
{
public:
    test_pattern_impl(const ::halfplane::signal_set& set, const std::string& pattern);
    std::uint64_t period() const override { return d_pattern.period(); }
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    const ::halfplane::pattern d_pattern;
    ::halfplane::pattern::reader d_reader;
};

} // namespace gr::halfplane
