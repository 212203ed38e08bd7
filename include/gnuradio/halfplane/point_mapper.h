// SPDX-License-Identifier: GPL-3.0-or-later
// point_mapper: indices, labels or bits to the complex points of a set.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/sync_decimator.h>

#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * Puts symbols on air: one complex sample a symbol, exactly the point as the set gives it (never rescaled).
 *
 * A symbol that the set does not have (an index ≥ M, a label that no point carries) ends the stream with an
 * error in the log that names the symbol and its value; nothing is sent in its place.
 */
class point_mapper : virtual public gr::sync_decimator
{
public:
    using sptr = std::shared_ptr<point_mapper>;

    /*!
     * \param set   the constellation; M from 2 to 4096
     * \param input what comes in: `indices` (int16, one a symbol, 0 … M−1), `byte_indices` (bytes, sets of up
     * to 255 points), `labels` (int16, one a symbol, the label as a number), or `bits` (bytes, one bit a byte
     * in its lowest bit, label_bits() a symbol, leftmost bit first) \throws std::invalid_argument where
     * `input` is none of these
     */
    static sptr make(const ::halfplane::signal_set& set, const std::string& input = "indices");
};

} // namespace gr::halfplane
