// SPDX-License-Identifier: GPL-3.0-or-later
// aligner: finds the pattern in the received symbols and puts the reference beside them.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/block.h>

#include <cstdint>
#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * In: one complex sample a symbol, at any gain and phase and with a small residual frequency. Out 0: the
 * samples, corrected from the past alone. Out 1 (int16): the index that was sent, or why there is none (−1
 * before lock, −2 slip, −3 signal lost, −4 overflow). Sample k of the input leaves as sample k of both
 * outputs, but only once `holdback` later ones have come in: gaps are judged afterwards. Where the input ends
 * by itself (a file, a head), what is held back comes out too; a flowgraph that is stopped leaves it inside.
 *
 * Tags on both outputs: `lock` (dict: state, delay, rotation_deg, mirrored, inverted, frequency, slips) at
 * the symbol with which a change takes effect, `pending` (uint64, symbols held back) at the first
 * and, while the hold-back empties at the end, with what is left. Tags of
 * the input go on to output 0 at their own sample.
 *
 * Samples lost by the radio: every `rx_time` tag after the first that does not fit the time gone by (all of
 * them where the symbol rate is unknown), and every message on port `overflow`.
 *
 * Message port `lock` (out): the dict of the tag, with `symbol`, as soon as it is known.
 */
class aligner : virtual public gr::block
{
public:
    using sptr = std::shared_ptr<aligner>;

    /*!
     * \param set         the constellation
     * \param pattern     as test_pattern takes it
     * \param correction  `running` (gain, phase and frequency follow), `held` (frozen after lock), `off`
     * (only the set's own rotation or mirror is undone) \param memory      symbols over which `running`
     * averages, ≥ 16 \param symbol_rate in Hz, to judge rx_time tags; 0 where unknown \throws
     * std::invalid_argument naming parameter and value
     */
    static sptr make(const ::halfplane::signal_set& set,
                     const std::string& pattern,
                     const std::string& correction = "running",
                     std::uint64_t memory = 2000,
                     double symbol_rate = 0);

    /// Symbols held back: output = max(0, input − holdback) until the input ends.
    static std::uint64_t holdback();
    /// `searching`, `held`, `doubtful` or `lost`.
    virtual std::string state() const = 0;
    /// Slips seen so far.
    virtual std::uint64_t slips() const = 0;
};

} // namespace gr::halfplane
