// SPDX-License-Identifier: GPL-3.0-or-later
// point_detector_impl: hands samples to the decider, writes its answers in the format wanted.
#pragma once

#include "halfplane/kernels/detect.h"
#include "symbol_format.h"

#include <gnuradio/halfplane/point_detector.h>

#include <cstdint>
#include <memory>
#include <mutex>
#include <vector>

namespace gr::halfplane {

class point_detector_impl final : public point_detector
{
public:
    point_detector_impl(const ::halfplane::signal_set& set, const std::string& output, double n0);

    void set_n0(double n0) override;
    double n0() const override;
    void set_signal_set(const ::halfplane::signal_set& set) override;
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    /// What one call of work() needs; replaced as a whole, so that setters never hold up the stream.
    struct decision {
        decision(const ::halfplane::signal_set& which, double density);
        ::halfplane::signal_set set;
        double n0;
        ::halfplane::kernels::point_decider decider;
    };
    std::shared_ptr<const decision> current() const;
    void replace(std::shared_ptr<const decision> next);

    const symbol_format d_format;
    mutable std::mutex d_mutex;
    std::shared_ptr<const decision> d_current;
    std::vector<std::uint16_t> d_indices;
};

} // namespace gr::halfplane
