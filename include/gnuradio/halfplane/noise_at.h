// SPDX-License-Identifier: GPL-3.0-or-later
// noise_at: white noise for a declared Es/N0 at the output of the matched filter.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/sync_block.h>

#include <cstdint>
#include <memory>
#include <vector>

namespace gr::halfplane {

/*!
 * Adds circular complex Gaussian noise of variance N0 to every sample, N0 = Es · E_h / γ: then a filter
 * matched to the transmit pulse h delivers symbols at Es/N0 = γ, whatever the samples a symbol. E_h = Σ|h|²
 * is a parameter, since usual pulse designs are not of unit energy. Es is the set's own; a gain between
 * mapper and this block must be put into E_h (as gain²); a gain after it acts on signal and noise alike.
 *
 * Message port `input` (out): {es_n0_db, es_n0_db_se = 0, source = "declared"} when the flowgraph starts,
 * before the first sample, and at each change. `link_watch` takes it.
 */
class noise_at : virtual public gr::sync_block
{
public:
    using sptr = std::shared_ptr<noise_at>;

    /*!
     * \param es           mean energy of a symbol, > 0, finite (signal_set::es())
     * \param es_n0_db     Es/N0 wanted, −200 … 200 dB
     * \param pulse_energy E_h > 0, finite; 1 at one sample a symbol without pulse shaping
     * \param seed         the same seed gives the same noise
     * \throws std::invalid_argument naming parameter and value
     */
    static sptr make(double es, double es_n0_db, double pulse_energy = 1, std::uint64_t seed = 1);
    static sptr make(const ::halfplane::signal_set& set,
                     double es_n0_db,
                     double pulse_energy = 1,
                     std::uint64_t seed = 1);

    /// E_h = Σ|h|² of pulse taps. \throws std::invalid_argument where there are none, all are 0, or one is
    /// not finite
    static double energy(const std::vector<float>& taps);

    /// New Es/N0, from the next call of work() on. \throws std::invalid_argument outside −200 … 200 dB
    virtual void set_es_n0_db(double es_n0_db) = 0;
    virtual double es_n0_db() const = 0;
    /// The variance added to each sample.
    virtual double n0() const = 0;
};

} // namespace gr::halfplane
