// SPDX-License-Identifier: GPL-3.0-or-later
// point_mapper_impl: table lookup, one complex sample a symbol.
#include "point_mapper_impl.h"

#include <gnuradio/io_signature.h>

#include <cstdint>

namespace gr::halfplane {

point_mapper::sptr point_mapper::make(const ::halfplane::signal_set& set, const std::string& input)
{
    return gnuradio::make_block_sptr<point_mapper_impl>(set, input);
}

point_mapper_impl::point_mapper_impl(const ::halfplane::signal_set& set, const std::string& input)
    : gr::sync_decimator(
          "point_mapper",
          gr::io_signature::make(1, 1, item_size(parse_symbol_format("point_mapper", "input", input))),
          gr::io_signature::make(1, 1, sizeof(gr_complex)),
          items_per_symbol(parse_symbol_format("point_mapper", "input", input), set)),
      d_set(set), d_format(parse_symbol_format("point_mapper", "input", input)),
      d_points(set.points().begin(), set.points().end())
{
    require_room("point_mapper", d_format, set);
}

/// Index of symbol k of the input, or −1 where the set has no such symbol.
int point_mapper_impl::symbol_at(const void* in, int k) const
{
    switch (d_format) {
    case symbol_format::indices: {
        const int index = static_cast<const std::int16_t*>(in)[k];
        return index < static_cast<int>(d_set.size()) ? index : -1;
    }
    case symbol_format::byte_indices: {
        const int index = static_cast<const std::uint8_t*>(in)[k];
        return index < static_cast<int>(d_set.size()) ? index : -1;
    }
    case symbol_format::labels: {
        const int label = static_cast<const std::int16_t*>(in)[k];
        return label < 0 ? -1 : d_set.index_of_label(static_cast<unsigned>(label));
    }
    case symbol_format::bits:
        break;
    }
    const unsigned count = d_set.label_bits();
    const auto* bits = static_cast<const std::uint8_t*>(in) + static_cast<std::size_t>(k) * count;
    unsigned label = 0;
    for (unsigned bit = 0; bit < count; ++bit)
        label = label << 1 | (bits[bit] & 1u);
    return d_set.index_of_label(label);
}

int point_mapper_impl::work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out)
{
    auto* samples = static_cast<gr_complex*>(out[0]);
    for (int k = 0; k < noutput_items; ++k) {
        const int index = symbol_at(in[0], k);
        if (index < 0) {
            if (k > 0)
                return k; // what is good goes out first
            d_logger->error("symbol {:d} of the input is not in the set of {:d} points; the stream ends here",
                            nitems_written(0),
                            d_set.size());
            return WORK_DONE;
        }
        samples[k] = d_points[static_cast<std::size_t>(index)];
    }
    return noutput_items;
}

} // namespace gr::halfplane
