// SPDX-License-Identifier: GPL-3.0-or-later
// llr_detector: complex samples to log-likelihood ratios of the label bits.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/sync_interpolator.h>

#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * Soft decisions for any set, labels and priors: label_bits() ratios a sample, leftmost bit first, in nats.
 * **A positive ratio speaks for bit 0** unless `positive` is 1, which flips every sign.
 *
 * `exact` sums over all points, `max-log` takes the likeliest point of each bit value; formula and accuracy
 * stand in halfplane/kernels/llr.h. The set stands for the points as they arrive: gain and phase must have
 * been taken out before. A sample that is NaN or infinite says nothing: its ratios are 0.
 */
class llr_detector : virtual public gr::sync_interpolator
{
public:
    using sptr = std::shared_ptr<llr_detector>;

    /*!
     * \param set        the constellation
     * \param n0         noise density N0, > 0, in the square of the points' unit
     * \param rule       `exact` or `max-log`
     * \param positive   the bit value that a positive ratio speaks for: 0 or 1
     * \param saturation ratios are clipped to ± this, in (0, 1e6]
     * \throws std::invalid_argument naming parameter and value
     */
    static sptr make(const ::halfplane::signal_set& set,
                     double n0,
                     const std::string& rule = "exact",
                     int positive = 0,
                     float saturation = 1e6f);

    /// New N0, from the next call of work() on. \throws std::invalid_argument as make()
    virtual void set_n0(double n0) = 0;
    virtual double n0() const = 0;
    /// Another set with as many label bits. \throws std::invalid_argument otherwise
    virtual void set_signal_set(const ::halfplane::signal_set& set) = 0;
};

} // namespace gr::halfplane
