// SPDX-License-Identifier: GPL-3.0-or-later
// noise_at_impl: adds noise drawn by the kernel and declares Es/N0.
#include "noise_at_impl.h"

#include "checks.h"

#include "halfplane/rates.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/halfplane/report_pmt.h>
#include <gnuradio/io_signature.h>

#include <algorithm>
#include <cmath>

namespace gr::halfplane {
namespace {

const pmt::pmt_t& input_port()
{
    static const pmt::pmt_t port = pmt::mp("input");
    return port;
}

double checked_energy(const char* parameter, double value)
{
    return checked(
        "noise_at", parameter, value, std::isfinite(value) && value > 0, "a finite number > 0 is wanted");
}

double checked_db(double value)
{
    return checked("noise_at", "es_n0_db", value, std::abs(value) <= 200, "−200 … 200 dB is wanted");
}

} // namespace

noise_at::sptr noise_at::make(double es, double es_n0_db, double pulse_energy, std::uint64_t seed)
{
    return gnuradio::make_block_sptr<noise_at_impl>(es, es_n0_db, pulse_energy, seed);
}

noise_at::sptr
noise_at::make(const ::halfplane::signal_set& set, double es_n0_db, double pulse_energy, std::uint64_t seed)
{
    return make(set.es(), es_n0_db, pulse_energy, seed);
}

double noise_at::energy(const std::vector<float>& taps)
{
    double sum = 0;
    for (const float tap : taps)
        sum += static_cast<double>(tap) * static_cast<double>(tap);
    return checked_energy("energy of the pulse taps", sum);
}

noise_at_impl::noise_at_impl(double es, double es_n0_db, double pulse_energy, std::uint64_t seed)
    : gr::sync_block("noise_at",
                     gr::io_signature::make(1, 1, sizeof(gr_complex)),
                     gr::io_signature::make(1, 1, sizeof(gr_complex))),
      d_received_energy(checked_energy("es", es) * checked_energy("pulse_energy", pulse_energy)),
      d_es_n0_db(checked_db(es_n0_db)), d_n0(d_received_energy / ::halfplane::from_db(es_n0_db)),
      d_noise(seed)
{
    message_port_register_out(input_port());
}

void noise_at_impl::set_es_n0_db(double es_n0_db)
{
    d_es_n0_db = checked_db(es_n0_db);
    d_n0 = d_received_energy / ::halfplane::from_db(es_n0_db);
    declare();
}

void noise_at_impl::declare()
{
    const nlohmann::ordered_json message{
        {"es_n0_db", d_es_n0_db.load()}, {"es_n0_db_se", 0.0}, {"source", "declared"}};
    message_port_pub(input_port(), json_to_pmt(message));
}

/// Runs before the first call of work(): the message is in the receiver's queue before any sample can be.
bool noise_at_impl::start()
{
    declare();
    return true;
}

int noise_at_impl::work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out)
{
    const auto* samples = static_cast<const gr_complex*>(in[0]);
    auto* noisy = static_cast<gr_complex*>(out[0]);
    std::copy(samples, samples + noutput_items, noisy);
    d_noise.add(nitems_written(0), static_cast<std::size_t>(noutput_items), d_n0, noisy);
    return noutput_items;
}

} // namespace gr::halfplane
