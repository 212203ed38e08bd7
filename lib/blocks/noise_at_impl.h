// SPDX-License-Identifier: GPL-3.0-or-later
// noise_at_impl: adds noise drawn by the kernel and declares Es/N0.
#pragma once

#include "halfplane/kernels/noise.h"

#include <gnuradio/halfplane/noise_at.h>

#include <atomic>

namespace gr::halfplane {

class noise_at_impl final : public noise_at
{
public:
    noise_at_impl(double es, double es_n0_db, double pulse_energy, std::uint64_t seed);

    void set_es_n0_db(double es_n0_db) override;
    double es_n0_db() const override { return d_es_n0_db; }
    double n0() const override { return d_n0; }
    bool start() override;
    int work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out) override;

private:
    void declare();

    const double d_received_energy; ///< Es · E_h
    std::atomic<double> d_es_n0_db, d_n0;
    const ::halfplane::kernels::complex_noise d_noise;
};

} // namespace gr::halfplane
