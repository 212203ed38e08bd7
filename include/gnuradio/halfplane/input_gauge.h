// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge: measures Es/N0 ahead of the receiver from raw samples.
#pragma once

#include <gnuradio/sync_block.h>

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <vector>

namespace gr::halfplane {

/*!
 * In: raw complex samples, as the radio gives them. Nothing out: it stands beside the receiver. Es/N0 is the
 * power within `band` above the noise, over symbol rate and density of the noise
 * (halfplane/link/input_gauge.h): what a matched filter would deliver, whatever the receiver makes of it.
 *
 * The density comes from `noise_band`; or, where that is empty, from a stretch with the transmitter off. When
 * it is off is said by tags on the input (key `transmitter`, value the symbol `on` or `off`, exact to the
 * sample), by messages of the same words on port `transmitter`, or by set_transmitter(). Until told otherwise
 * it is on. A new quiet stretch replaces the one before.
 *
 * Message port `input` (out): {es_n0_db, es_n0_db_se, source = "measured", segments, nonfinite} after each
 * `interval`. `link_watch` takes it.
 */
class input_gauge : virtual public gr::sync_block
{
public:
    using sptr = std::shared_ptr<input_gauge>;

    /*!
     * \param sample_rate Hz, > 0
     * \param symbol_rate Hz, > 0, at most the sample rate
     * \param band        {low, high} of the signal, Hz relative to the centre; at least symbol_rate wide
     * \param noise_band  {low, high} with nothing but noise; empty: a stretch with the transmitter off
     * \param interval    seconds of samples from one message to the next, > 0
     * \param segments    periodograms averaged for a message, at least 64: as many as there are, when fewer
     * \throws std::invalid_argument naming parameter and value
     */
    static sptr make(double sample_rate,
                     double symbol_rate,
                     const std::vector<double>& band,
                     const std::vector<double>& noise_band = {},
                     double interval = 1,
                     std::size_t segments = 4000);

    /// From the next call of work() on.
    virtual void set_transmitter(bool on) = 0;
    /// What the latest message said, as JSON text; empty before the first.
    virtual std::string reading() const = 0;
    virtual std::uint64_t nonfinite() const = 0;
};

} // namespace gr::halfplane
