// SPDX-License-Identifier: GPL-3.0-or-later
// error_tally: errors behind any decoder, in two streams of bits that should be equal.
#pragma once

#include <gnuradio/block.h>

#include <cstdint>
#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * In 0 (bytes): what was sent. In 1 (bytes): what the decoder made of it, `delay` bytes later. One bit a
 * byte, or eight of them, the most significant first (`packed`). Where one stream ends before the other, what
 * has no counterpart is not counted.
 *
 * Message port `report` (out): bits and frames in error with intervals that mind bursts, the account, the
 * verdict (halfplane/link/bit_tally.h), after `window` bits and no more than ten times a second; the last one
 * when the flowgraph ends, as with `link_watch`.
 */
class error_tally : virtual public gr::block
{
public:
    using sptr = std::shared_ptr<error_tally>;

    /*!
     * \param packed       eight bits a byte, else one
     * \param frame_bits   bits of a frame, from the first compared one on; 0: no frames
     * \param target       of the verdict: "ber:1e-5", "fer:1e-2"; empty: no verdict
     * \param delay        bytes of input 1 that come before the first counterpart, ≥ 0
     * \param window       bits, ≥ 1
     * \param confidence   of intervals and verdict, inside (0, 1)
     * \param max_excluded share of bits (frames) left out beyond which nothing passes, in 0 … 1
     * \throws std::invalid_argument naming parameter and value
     */
    static sptr make(bool packed = false,
                     std::uint64_t frame_bits = 0,
                     const std::string& target = "",
                     std::uint64_t delay = 0,
                     std::uint64_t window = 1000000,
                     double confidence = 0.95,
                     double max_excluded = 1e-3);

    /// The latest report as JSON text; empty before the first. The final one after top_block.wait().
    virtual std::string report() const = 0;
};

} // namespace gr::halfplane
