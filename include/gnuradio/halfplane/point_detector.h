// SPDX-License-Identifier: GPL-3.0-or-later
// point_detector: complex samples to indices, labels or bits.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/sync_interpolator.h>

#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * Exact decisions, one a sample: the nearest point (ML), or the most probable one (MAP) once N0 is known. The
 * cost does not grow with the number of points. The set stands for the points as they arrive: gain and phase
 * must have been taken out before.
 *
 * A sample that is NaN or infinite has no nearest point: its index and label are −1, as a byte 255, as
 * are its bits.
 */
class point_detector : virtual public gr::sync_interpolator
{
public:
    using sptr = std::shared_ptr<point_detector>;

    /*!
     * \param set    the constellation
     * \param output `indices` (int16, one a sample), `byte_indices` (bytes, sets of up to 255 points),
     * `labels` (int16, the label as a number), or `bits`
     * (bytes, one bit a byte, label_bits() a sample, leftmost bit first) \param n0     noise density N0 for
     * MAP decisions, > 0, in the square of the points' unit; 0: nearest point \throws std::invalid_argument
     * naming parameter and value
     */
    static sptr
    make(const ::halfplane::signal_set& set, const std::string& output = "indices", double n0 = 0);

    /// New N0 (0: nearest point), from the next call of work() on. \throws std::invalid_argument as make()
    virtual void set_n0(double n0) = 0;
    virtual double n0() const = 0;
    /// Another set. With `bits` it must have as many label bits. \throws std::invalid_argument otherwise
    virtual void set_signal_set(const ::halfplane::signal_set& set) = 0;
};

} // namespace gr::halfplane
