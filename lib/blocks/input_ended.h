// SPDX-License-Identifier: GPL-3.0-or-later
// input_ended: whether a block with a delay has to let go of what it holds.
#pragma once

#include <gnuradio/block.h>

namespace gr::halfplane {

/// Nothing more comes on input 0, and all that came was taken.
bool input_ended(const gr::block& block);

} // namespace gr::halfplane
