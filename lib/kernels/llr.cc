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

namespace {

/// Members of a part: for each its point on the axes that count, its bits and its prior.
struct member {
    complex point;
    std::uint16_t label;
    double prior;
};

/// The arrays behind an llr_part.
struct part {
    part(std::vector<member> m,
         const std::vector<std::uint8_t>& positions,
         std::vector<std::uint16_t> of_index)
        : members(std::move(m)), position(positions), place(std::move(of_index))
    {
        const auto bits = static_cast<unsigned>(position.size());
        std::vector<std::size_t> order(members.size());
        std::iota(order.begin(), order.end(), std::size_t{0});
        std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
            return members[a].label < members[b].label;
        });
        std::vector<member> sorted;
        std::vector<std::uint16_t> place_of(members.size());
        std::vector<bool> carried(std::size_t{1} << bits);
        double least = 1, most = 0;
        for (const std::size_t i : order) {
            place_of[i] = static_cast<std::uint16_t>(sorted.size());
            sorted.push_back(members[i]);
            label.push_back(members[i].label);
            carried[members[i].label] = true;
            view.has_one |= members[i].label;
            view.has_zero |= static_cast<std::uint16_t>(~members[i].label);
            least = std::min(least, members[i].prior), most = std::max(most, members[i].prior);
        }
        members = std::move(sorted);
        for (std::uint16_t& i : place)
            i = place_of[i];
        for (std::size_t l = 0; l < carried.size(); ++l)
            if (!carried[l])
                missing.push_back(static_cast<std::uint16_t>(l));
        // Around the nearest point the largest metric is off by no more than the priors tell; exponents bear
        // more.
        view.near_is_enough = std::log(most / least) < 60;
        view.size = members.size(), view.bits = bits;
        view.axis = llr_part::both;
        const auto all = [&](auto coordinate) {
            return std::all_of(
                members.begin(), members.end(), [&](const member& m) { return coordinate(m.point) == 0; });
        };
        if (all([](complex s) { return s.imag(); }))
            view.axis = llr_part::in_phase;
        else if (all([](complex s) { return s.real(); }))
            view.axis = llr_part::quadrature;
    }

    void lay(double n0)
    {
        re.clear(), im.clear(), constant.clear();
        for (const member& m : members) {
            re.push_back(2 * m.point.real() / n0);
            im.push_back(2 * m.point.imag() / n0);
            constant.push_back(-std::norm(m.point) / n0 + std::log(m.prior));
        }
        view.re = re.data(), view.im = im.data(), view.constant = constant.data();
        view.label = label.data(), view.position = position.data(), view.place = place.data();
        view.missing = missing.data(), view.missing_count = missing.size();
    }

    std::vector<member> members;
    std::vector<double> re, im, constant;
    std::vector<std::uint16_t> label, missing;
    std::vector<std::uint8_t> position;
    std::vector<std::uint16_t> place; // by index in the set
    llr_part view{};
};

/// The bits of `label` (of `width` bits, leftmost first) at the given positions.
std::uint16_t picked(label_t label, unsigned width, const std::vector<std::uint8_t>& positions)
{
    unsigned bits = 0;
    for (std::size_t k = positions.size(); k-- > 0;)
        bits = bits << 1 | (label >> (width - 1 - positions[k]) & 1u);
    return static_cast<std::uint16_t>(bits);
}

/*!
 * The set as a product of in-phase and quadrature: each coordinate pair occurs, each bit depends on one
 * coordinate alone, and priors are products. Empty where it is none.
 */
std::vector<part> as_product(const signal_set& set)
{
    const std::size_t size = set.size();
    const unsigned width = set.label_bits();
    std::vector<double> level[2];
    for (const complex s : set.points())
        level[0].push_back(s.real()), level[1].push_back(s.imag());
    std::vector<std::uint16_t> place[2];
    std::vector<double> prior[2];
    for (int axis = 0; axis < 2; ++axis) {
        std::vector<double> all = level[axis];
        std::sort(all.begin(), all.end());
        all.erase(std::unique(all.begin(), all.end()), all.end());
        prior[axis].assign(all.size(), 0);
        for (std::size_t i = 0; i < size; ++i) {
            const auto at = std::lower_bound(all.begin(), all.end(), level[axis][i]) - all.begin();
            place[axis].push_back(static_cast<std::uint16_t>(at));
            prior[axis][static_cast<std::size_t>(at)] += set.priors()[i];
        }
        level[axis] = all;
    }
    // Points are distinct, so as many as pairs means every pair.
    if (level[0].size() * level[1].size() != size || level[0].size() < 2 || level[1].size() < 2)
        return {};
    for (std::size_t i = 0; i < size; ++i)
        if (std::abs(prior[0][place[0][i]] * prior[1][place[1][i]] / set.priors()[i] - 1) > 1e-12)
            return {};
    std::vector<std::uint8_t> position[2];
    for (unsigned bit = 0; bit < width; ++bit) {
        bool depends[2] = {true, true}; // on this axis alone
        for (int axis = 0; axis < 2; ++axis) {
            std::vector<int> value(level[axis].size(), -1);
            for (std::size_t i = 0; i < size; ++i) {
                const int b = set.labels()[i] >> (width - 1 - bit) & 1;
                int& known = value[place[axis][i]];
                depends[axis] = depends[axis] && (known < 0 || known == b);
                known = b;
            }
        }
        if (!depends[0] && !depends[1])
            return {};
        position[depends[0] ? 0 : 1].push_back(static_cast<std::uint8_t>(bit));
    }
    std::vector<part> parts;
    for (int axis = 0; axis < 2; ++axis) {
        std::vector<member> members(level[axis].size());
        for (std::size_t i = 0; i < size; ++i) {
            const std::uint16_t at = place[axis][i];
            members[at] = {axis == 0 ? complex(level[0][at], 0) : complex(0, level[1][at]),
                           picked(set.labels()[i], width, position[axis]),
                           prior[axis][at]};
        }
        parts.emplace_back(std::move(members), position[axis], place[axis]);
    }
    return parts;
}

part as_whole(const signal_set& set)
{
    std::vector<std::uint8_t> position;
    for (unsigned bit = set.label_bits(); bit-- > 0;)
        position.push_back(static_cast<std::uint8_t>(bit));
    std::vector<member> members;
    std::vector<std::uint16_t> place(set.size());
    std::iota(place.begin(), place.end(), std::uint16_t{0});
    for (std::size_t i = 0; i < set.size(); ++i)
        members.push_back(
            {set.points()[i], picked(set.labels()[i], set.label_bits(), position), set.priors()[i]});
    return part(std::move(members), position, std::move(place));
}

} // namespace

struct llr_decider::impl {
    impl(const signal_set& s, llr_options o);
    void lay(double density);

    signal_set set;
    llr_options options;
    point_decider nearest;
    double n0 = 0;
    std::vector<part> parts;
    llr_view view{};
};

llr_decider::impl::impl(const signal_set& s, llr_options o)
    : set(s), options(o), nearest(s), parts(as_product(s))
{
    if (!(options.saturation > 0 && options.saturation <= 1e6f))
        throw std::invalid_argument("llr_decider: saturation must be in (0, 1e6], not " +
                                    std::to_string(options.saturation));
    if (parts.empty())
        parts.push_back(as_whole(set));
    view.parts = static_cast<unsigned>(parts.size());
    view.label_bits = set.label_bits();
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
    for (unsigned p = 0; p < view.parts; ++p) {
        parts[p].lay(n0);
        view.part[p] = parts[p].view;
    }
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
    const bool wanted = d->view.wants_decisions();
    while (count > 0) {
        const std::size_t n = std::min(count, block);
        if (wanted)
            d->nearest.decide(in, decided, n);
        loops().llr(
            d->view, reinterpret_cast<const float*>(in), wanted ? decided : nullptr, out, n, scratch.data());
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
