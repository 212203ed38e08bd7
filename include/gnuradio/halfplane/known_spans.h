// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans: puts a reference beside those symbols of live traffic of which somebody knows what was sent.
#pragma once

#include "halfplane/link/known_spans.h"
#include "halfplane/signal_set.h"

#include <gnuradio/block.h>

#include <cstdint>
#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * In: one complex sample a symbol. Out 0: the same samples. Out 1 (int16): the index that was sent where a
 * span says so; with 4096 added where the span is known only by decoding; −5 (live traffic) elsewhere.
 * link_watch follows, as behind aligner. Sample k of the input leaves as sample k of both outputs, but only
 * once `hold_back` later ones have come in: that is the time in which the receiver may say what it found.
 * Where the input ends by itself, what is held back comes out too; a flowgraph that is stopped leaves it
 * inside.
 *
 * Spans arrive
 * - as tags of the input, key `tag_key`, at the span's first symbol: a vector of integers (PMT uniform
 * vector, of any width) says what was sent and known in advance, a dict {indices: vector, decoded: bool} the
 * same or what was decoded;
 * - as PDUs on message port `known`: metadata {first_symbol: place in the input from 0, decoded: bool, false
 *   where missing}, data: the indices. May come before, while and after its symbols pass.
 *
 * Samples and messages travel on different ways. Where the samples pass the block that finds the frames, it
 * has spoken of a symbol before that arrives, and a hold-back of a frame and one buffer between two blocks
 * (8192 symbols) loses none; where they run beside it, add what the buffers of its branch hold.
 *
 * Decoded means: of a frame whose check held, encoded anew. Frames that failed are missing among these, so
 * they flatter; what a span known in advance says of a symbol outranks it. Where a span contradicts an
 * earlier one, it is left out whole and counted. A tag or a message that is not understood is logged with its
 * place and counted; the stream goes on.
 *
 * Tags out: `pending` as of aligner; all others of the input but `tag_key` go on to output 0 at their own
 * sample. Message port `spans` (out): dict of counts as in counts(), and `refused`, once a second at most;
 * late, early or contradicted spans are logged as often.
 */
class known_spans : virtual public gr::block
{
public:
    using sptr = std::shared_ptr<known_spans>;

    /*!
     * \param set       the constellation
     * \param hold_back symbols, 0 … 2^24: more than a frame and all that the receiver buffers
     * \param tag_key   key of the tags that carry spans
     * \throws std::invalid_argument naming parameter and value
     */
    static sptr make(const ::halfplane::signal_set& set,
                     std::uint64_t hold_back = 4096,
                     const std::string& tag_key = "known");

    virtual std::uint64_t hold_back() const = 0;
    virtual ::halfplane::link::span_counts counts() const = 0;
    /// Tags and messages that were not understood.
    virtual std::uint64_t refused() const = 0;
};

} // namespace gr::halfplane
