// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/kernels/llr.h"

#include "halfplane/kernels/detect.h"
#include "llr_view.h"
#include "loops.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <stdexcept>
#include <string>
#include <vector>

namespace halfplane::kernels {

struct llr_decider::impl {
    impl(const signal_set& s, llr_options o);
    void lay(double density);

    signal_set set;
    llr_options options;
    point_decider nearest;
    double n0 = 0;
    std::vector<std::size_t> order; // indices by ascending label
    std::vector<double> re, im, constant;
    std::vector<std::uint16_t> label, missing, place;
    llr_view view{};
};

llr_decider::impl::impl(const signal_set& s, llr_options o) : set(s), options(o), nearest(s)
{
    if (!(options.saturation > 0 && options.saturation <= 1e6f))
        throw std::invalid_argument("llr_decider: saturation must be in (0, 1e6], not " +
                                    std::to_string(options.saturation));
    order.resize(set.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return set.labels()[a] < set.labels()[b];
    });
    place.resize(set.size());
    for (std::size_t i = 0; i < order.size(); ++i) {
        const label_t l = set.labels()[order[i]];
        label.push_back(l);
        place[order[i]] = static_cast<std::uint16_t>(i);
        view.has_one |= l;
        view.has_zero |= static_cast<label_t>(~l);
    }
    for (unsigned l = 0; l < 1u << set.label_bits(); ++l)
        if (set.index_of_label(l) < 0)
            missing.push_back(static_cast<std::uint16_t>(l));

    // Around the nearest point the largest metric is off by no more than the priors tell; float exponentials
    // bear 60.
    const auto [least, most] = std::minmax_element(set.priors().begin(), set.priors().end());
    view.near_is_enough = std::log(*most / *least) < 60;
    view.label = label.data(), view.size = set.size(), view.label_bits = set.label_bits();
    view.missing = missing.data(), view.missing_count = missing.size();
    view.place = place.data();
    view.exact = options.rule == llr_rule::exact;
    view.sign = options.sign == llr_sign::positive_is_0 ? 1.0f : -1.0f;
    view.saturation = options.saturation;
}

void llr_decider::impl::lay(double density)
{
    if (!(density > 0) || !std::isfinite(density))
        throw std::invalid_argument("llr_decider: n0 must be positive and finite, not " +
                                    std::to_string(density));
    n0 = density;
    re.clear(), im.clear(), constant.clear();
    for (const std::size_t i : order) {
        const complex s = set.points()[i];
        re.push_back(2 * s.real() / n0);
        im.push_back(2 * s.imag() / n0);
        constant.push_back(-std::norm(s) / n0 + std::log(set.priors()[i]));
    }
    view.re = re.data(), view.im = im.data(), view.constant = constant.data();
}

llr_decider::llr_decider(const signal_set& set, double n0, llr_options options)
    : d(std::make_unique<impl>(set, options))
{
    d->lay(n0);
}
llr_decider::~llr_decider() = default;
llr_decider::llr_decider(llr_decider&&) noexcept = default;
llr_decider& llr_decider::operator=(llr_decider&&) noexcept = default;

void llr_decider::set_n0(double n0)
{
    d->lay(n0);
}
double llr_decider::n0() const noexcept
{
    return d->n0;
}
unsigned llr_decider::label_bits() const noexcept
{
    return d->set.label_bits();
}

void llr_decider::decide(const std::complex<float>* in, float* out, std::size_t count) const
{
    constexpr std::size_t block = 512;
    std::uint16_t decided[block];
    std::vector<float> scratch(d->view.scratch());
    while (count > 0) {
        const std::size_t n = std::min(count, block);
        d->nearest.decide(in, decided, n);
        loops().llr(d->view, reinterpret_cast<const float*>(in), decided, out, n, scratch.data());
        in += n, out += n * d->view.label_bits, count -= n;
    }
}

void llr_decider::decide_reference(const std::complex<float>* in, double* out, std::size_t count) const
{
    const unsigned bits = d->set.label_bits();
    const double limit = d->options.saturation, sign = d->view.sign;
    std::vector<double> metric(d->set.size());
    for (std::size_t k = 0; k < count; ++k)
        for (unsigned b = 0; b < bits; ++b, ++out) {
            const complex r(in[k]);
            if (!std::isfinite(r.real()) || !std::isfinite(r.imag())) {
                *out = 0;
                continue;
            }
            double best[2], sum[2] = {0, 0};
            best[0] = best[1] = -std::numeric_limits<double>::infinity();
            for (std::size_t i = 0; i < metric.size(); ++i) {
                // |r|² is common to all terms.
                const complex s = d->set.points()[i];
                metric[i] = (2 * (r.real() * s.real() + r.imag() * s.imag()) - std::norm(s)) / d->n0 +
                            std::log(d->set.priors()[i]);
                double& top = best[d->set.labels()[i] >> (bits - 1 - b) & 1];
                top = std::max(top, metric[i]);
            }
            for (std::size_t i = 0; i < metric.size(); ++i) {
                const unsigned side = d->set.labels()[i] >> (bits - 1 - b) & 1;
                sum[side] += std::exp(metric[i] - best[side]);
            }
            double ratio = best[0] - best[1];
            if (d->options.rule == llr_rule::exact && std::isfinite(ratio))
                ratio += std::log(sum[0]) - std::log(sum[1]);
            *out = sign * std::clamp(ratio, -limit, limit);
        }
}

} // namespace halfplane::kernels
