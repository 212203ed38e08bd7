// SPDX-License-Identifier: GPL-3.0-or-later
// test_pattern: the known symbols of a link, as a source of indices.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/sync_block.h>

#include <cstdint>
#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * An endless source of point indices (int16), the same that `aligner` and `link_watch` expect under the same
 * pattern and set. Starts with symbol 0 of the pattern.
 */
class test_pattern : virtual public gr::sync_block
{
public:
    using sptr = std::shared_ptr<test_pattern>;

    /*!
     * \param set     the constellation that will carry the pattern
     * \param pattern `o150:N` (ITU-T O.150, N = 9, 11, 15, 20, 23, 29, 31 stages; sets of a power of two
     * only), `draw:SEED[:PERIOD]` (indices by prior), `file:PATH` (text: bits, or indices with spaces)
     * \throws std::invalid_argument naming the part that is not understood, or why the set cannot carry it
     */
    static sptr make(const ::halfplane::signal_set& set, const std::string& pattern);

    /// Symbols after which the pattern repeats.
    virtual std::uint64_t period() const = 0;
};

} // namespace gr::halfplane
