// SPDX-License-Identifier: GPL-3.0-or-later
// llr_detector_impl: hands samples to the soft decider.
#pragma once

#include "halfplane/kernels/llr.h"

#include <gnuradio/halfplane/llr_detector.h>

#include <mutex>

namespace gr::halfplane {

class llr_detector_impl final : public llr_detector
{
public:
    llr_detector_impl(const ::halfplane::signal_set& set,
                      double n0,
                      const ::halfplane::kernels::llr_options& options);

    void set_n0(double n0) override;
    double n0() const override;
    void set_signal_set(const ::halfplane::signal_set& set) override;
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    const ::halfplane::kernels::llr_options d_options;
    mutable std::mutex d_mutex; // held for one call of work(): a new N0 costs O(M), a new set is made outside
    ::halfplane::kernels::llr_decider d_decider;
};

} // namespace gr::halfplane
