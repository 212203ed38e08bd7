// SPDX-License-Identifier: GPL-3.0-or-later
// point_mapper_impl: table lookup, one complex sample a symbol.
#pragma once

#include "symbol_format.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/halfplane/point_mapper.h>

#include <vector>

namespace gr::halfplane {

class point_mapper_impl final : public point_mapper
{
public:
    point_mapper_impl(const ::halfplane::signal_set& set, const std::string& input);
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    int symbol_at(const void* in, int k) const;

    const ::halfplane::signal_set d_set;
    const symbol_format d_format;
    std::vector<gr_complex> d_points;
};

} // namespace gr::halfplane
