// SPDX-License-Identifier: GPL-3.0-or-later
// point_detector_impl: hands samples to the decider, writes its answers in the format wanted.
#include "point_detector_impl.h"

#include "checks.h"

#include <gnuradio/gr_complex.h>
#include <gnuradio/io_signature.h>

#include <algorithm>
#include <cmath>

namespace gr::halfplane {
namespace {

using ::halfplane::kernels::point_decider;

point_decider make_decider(const ::halfplane::signal_set& set, double n0)
{
    checked("point_detector", "n0", n0, std::isfinite(n0) && n0 >= 0, "a finite number ≥ 0 is wanted");
    return n0 > 0 ? point_decider(set, n0) : point_decider(set);
}

constexpr std::uint8_t nothing = 255; // a byte that is no bit and no index

} // namespace

point_detector::sptr
point_detector::make(const ::halfplane::signal_set& set, const std::string& output, double n0)
{
    return gnuradio::make_block_sptr<point_detector_impl>(set, output, n0);
}

point_detector_impl::decision::decision(const ::halfplane::signal_set& which, double density)
    : set(which), n0(density), decider(make_decider(which, density))
{
}

point_detector_impl::point_detector_impl(const ::halfplane::signal_set& set,
                                         const std::string& output,
                                         double n0)
    : gr::sync_interpolator(
          "point_detector",
          gr::io_signature::make(1, 1, sizeof(gr_complex)),
          gr::io_signature::make(1, 1, item_size(parse_symbol_format("point_detector", "output", output))),
          static_cast<unsigned>(
              items_per_symbol(parse_symbol_format("point_detector", "output", output), set))),
      d_format(parse_symbol_format("point_detector", "output", output)),
      d_current(std::make_shared<const decision>(set, n0))
{
    require_room("point_detector", d_format, set);
}

std::shared_ptr<const point_detector_impl::decision> point_detector_impl::current() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_current;
}

void point_detector_impl::replace(std::shared_ptr<const decision> next)
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    d_current = std::move(next);
}

void point_detector_impl::set_n0(double n0)
{
    replace(std::make_shared<const decision>(current()->set, n0));
}

double point_detector_impl::n0() const
{
    return current()->n0;
}

void point_detector_impl::set_signal_set(const ::halfplane::signal_set& set)
{
    const auto now = current();
    require_room("point_detector", d_format, set);
    if (d_format == symbol_format::bits)
        checked("point_detector",
                "label bits of the new set",
                set.label_bits(),
                set.label_bits() == now->set.label_bits(),
                "the output has a fixed number of bits a sample");
    replace(std::make_shared<const decision>(set, now->n0));
}

int point_detector_impl::work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star& out)
{
    const auto now = current();
    const auto* samples = static_cast<const gr_complex*>(in[0]);
    const auto count = static_cast<std::size_t>(noutput_items) / interpolation();
    if (d_format == symbol_format::indices) {
        // `nonfinite` reads −1 as int16.
        now->decider.decide(samples, static_cast<std::uint16_t*>(out[0]), count);
        return noutput_items;
    }

    d_indices.resize(std::max(d_indices.size(), count));
    now->decider.decide(samples, d_indices.data(), count);
    const auto& labels = now->set.labels();
    if (d_format == symbol_format::labels) {
        auto* label = static_cast<std::int16_t*>(out[0]);
        for (std::size_t k = 0; k < count; ++k)
            label[k] = d_indices[k] == point_decider::nonfinite
                           ? std::int16_t{-1}
                           : static_cast<std::int16_t>(labels[d_indices[k]]);
        return noutput_items;
    }
    if (d_format == symbol_format::byte_indices) {
        auto* index = static_cast<std::uint8_t*>(out[0]);
        for (std::size_t k = 0; k < count; ++k) // 0xffff, for what is not finite, becomes 255
            index[k] = static_cast<std::uint8_t>(d_indices[k]);
        return noutput_items;
    }
    auto* bit = static_cast<std::uint8_t*>(out[0]);
    for (std::size_t k = 0; k < count; ++k)
        for (unsigned place = interpolation(); place-- > 0;)
            *bit++ = d_indices[k] == point_decider::nonfinite ? nothing : labels[d_indices[k]] >> place & 1u;
    return noutput_items;
}

} // namespace gr::halfplane
