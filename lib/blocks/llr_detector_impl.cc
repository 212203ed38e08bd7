// SPDX-License-Identifier: GPL-3.0-or-later
// llr_detector_impl: hands samples to the soft decider.
#include "llr_detector_impl.h"

#include "checks.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/io_signature.h>

#include <cmath>
#include <utility>

namespace gr::halfplane {
namespace {

using namespace ::halfplane::kernels;

double checked_n0(double n0)
{
    return checked("llr_detector", "n0", n0, std::isfinite(n0) && n0 > 0, "a finite number > 0 is wanted");
}

llr_rule parse_rule(const std::string& rule)
{
    if (rule == "exact")
        return llr_rule::exact;
    if (rule == "max-log")
        return llr_rule::max_log;
    refuse_word("llr_detector", "rule", rule, "one of exact, max-log is wanted");
}

} // namespace

llr_detector::sptr llr_detector::make(
    const ::halfplane::signal_set& set, double n0, const std::string& rule, int positive, float saturation)
{
    checked("llr_detector",
            "positive",
            positive,
            positive == 0 || positive == 1,
            "the bit value that a positive ratio speaks for, 0 or 1, is wanted");
    checked("llr_detector",
            "saturation",
            saturation,
            saturation > 0 && saturation <= 1e6f,
            "a number in (0, 1e6] is wanted");
    return gnuradio::make_block_sptr<llr_detector_impl>(
        set,
        n0,
        llr_options{
            parse_rule(rule), positive == 0 ? llr_sign::positive_is_0 : llr_sign::positive_is_1, saturation});
}

llr_detector_impl::llr_detector_impl(const ::halfplane::signal_set& set,
                                     double n0,
                                     const llr_options& options)
    : gr::sync_interpolator("llr_detector",
                            gr::io_signature::make(1, 1, sizeof(gr_complex)),
                            gr::io_signature::make(1, 1, sizeof(float)),
                            set.label_bits()),
      d_options(options), d_decider(set, checked_n0(n0), options)
{
}

void llr_detector_impl::set_n0(double n0)
{
    checked_n0(n0);
    const std::lock_guard<std::mutex> lock(d_mutex);
    d_decider.set_n0(n0);
}

double llr_detector_impl::n0() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_decider.n0();
}

void llr_detector_impl::set_signal_set(const ::halfplane::signal_set& set)
{
    checked("llr_detector",
            "label bits of the new set",
            set.label_bits(),
            set.label_bits() == static_cast<unsigned>(interpolation()),
            "the output has a fixed number of ratios a sample");
    llr_decider next(set, n0(), d_options);
    const std::lock_guard<std::mutex> lock(d_mutex);
    next.set_n0(d_decider.n0()); // it may have changed meanwhile
    std::swap(d_decider, next);
}

int llr_detector_impl::work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out)
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    d_decider.decide(static_cast<const gr_complex*>(in[0]),
                     static_cast<float*>(out[0]),
                     static_cast<std::size_t>(noutput_items) / interpolation());
    return noutput_items;
}

} // namespace gr::halfplane
