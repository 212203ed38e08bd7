// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/kernels/detect.h"

#include "candidate_map.h"
#include "loops.h"

#include <cmath>
#include <limits>
#include <stdexcept>
#include <string>

namespace halfplane::kernels {

struct point_decider::impl {
    impl(const signal_set& set, const std::vector<double>& bias) : map(set, bias), view(map.view()) {}
    candidate_map map;
    detect_view view;
};

namespace {
std::vector<double> map_bias(const signal_set& set, double n0)
{
    if (!(n0 > 0) || !std::isfinite(n0))
        throw std::invalid_argument("point_decider: n0 must be positive and finite, not " +
                                    std::to_string(n0));
    std::vector<double> bias;
    for (const double p : set.priors())
        bias.push_back(n0 / 2 * std::log(p));
    return bias;
}
} // namespace

point_decider::point_decider(const signal_set& set) : d(std::make_unique<impl>(set, std::vector<double>{})) {}
point_decider::point_decider(const signal_set& set, double n0)
    : d(std::make_unique<impl>(set, map_bias(set, n0)))
{
}
point_decider::~point_decider() = default;
point_decider::point_decider(point_decider&&) noexcept = default;
point_decider& point_decider::operator=(point_decider&&) noexcept = default;

void point_decider::decide(const std::complex<float>* in, std::uint16_t* out, std::size_t count) const
{
    loops().decide(d->view, reinterpret_cast<const float*>(in), out, count);
}

void point_decider::decide_reference(const std::complex<float>* in,
                                     std::uint16_t* out,
                                     std::size_t count) const
{
    for (std::size_t k = 0; k < count; ++k) {
        const double x = in[k].real(), y = in[k].imag();
        if (!std::isfinite(x) || !std::isfinite(y)) {
            out[k] = nonfinite;
            continue;
        }
        double top = -std::numeric_limits<double>::infinity();
        for (std::size_t i = 0; i < d->view.size; ++i) {
            const point_metric& m = d->view.metrics[i];
            const double value = x * m.re + y * m.im + m.constant;
            if (value > top) {
                top = value;
                out[k] = static_cast<std::uint16_t>(i);
            }
        }
    }
}

} // namespace halfplane::kernels
