// SPDX-License-Identifier: GPL-3.0-or-later
// input_ended: whether a block with a delay has to let go of what it holds.
#include "input_ended.h"

#include <gnuradio/block_detail.h>
#include <gnuradio/buffer_reader.h>

namespace gr::halfplane {

bool input_ended(const gr::block& block)
{
    const auto input = block.detail()->input(0);
    const gr::thread::scoped_lock guard(*input->mutex());
    return input->done() && input->items_available() == 0;
}

} // namespace gr::halfplane
