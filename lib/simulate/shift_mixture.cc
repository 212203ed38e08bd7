// SPDX-License-Identifier: GPL-3.0-or-later
#include "shift_mixture.h"

#include "halfplane/cells.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

namespace halfplane {

namespace {

/// Cells of the detector, in the points' unit divided by `unit`.
cells cells_of(const link_model& link, double unit)
{
    std::vector<complex> points;
    std::vector<double> weights;
    for (const complex s : link.set().points())
        points.push_back(s / unit);
    if (link.map_rule())
        for (const double p : link.set().priors())
            weights.push_back(link.n0() * std::log(p) / (unit * unit));
    return cells(points, weights);
}

/// From the mean to the nearest point of the edge.
complex way_to(const edge& e, complex mean)
{
    const edge_view seen = e.seen_from(mean);
    const complex tangent(-e.normal.imag(), e.normal.real());
    return seen.height * e.normal + std::clamp(0.0, seen.from, seen.to) * tangent;
}

} // namespace

shift_mixture::shift_mixture(const link_model& link, const std::vector<channel_state>& states)
{
    const signal_set& set = link.set();
    double unit = 0;
    for (const complex s : set.points())
        unit = std::max(unit, std::abs(s));
    const cells regions = cells_of(link, unit);

    std::vector<double> exponent; // ln of the share, not yet normalised; −∞ for the unshifted
    for (std::size_t i = 0; i < set.size(); ++i) {
        const complex mean = link.means()[i] / unit;
        for (const channel_state& state : states) {
            const double n0 = link.n0() / state.gain, prior = set.priors()[i] * state.probability;
            const auto number = static_cast<std::uint32_t>(d_groups.size());
            d_groups.push_back({prior, static_cast<std::uint32_t>(d_components.size()), 0});
            d_components.push_back({static_cast<std::uint16_t>(i), number, n0, 0});
            exponent.push_back(-std::numeric_limits<double>::infinity());
            for (const std::uint32_t* e = regions.begin_of(i); e != regions.end_of(i); ++e) {
                const edge& shared = regions.edges()[*e];
                const complex shift = unit * way_to(shared.inner == i ? shared : shared.reversed(), mean);
                d_components.push_back({static_cast<std::uint16_t>(i), number, n0, shift});
                exponent.push_back(std::log(prior) - std::norm(shift) / n0);
            }
            d_groups.back().last = static_cast<std::uint32_t>(d_components.size());
        }
    }
    const double top = *std::max_element(exponent.begin(), exponent.end());
    constexpr double least = -645; // ln 1e-280
    if (top < least)
        throw std::invalid_argument("simulate: errors are rarer than 1e-280 at this Es/N0");
    d_unit = std::exp(top);
    double sum = 0;
    for (const double e : exponent)
        sum += std::exp(e - top);
    double up_to = 0;
    for (std::size_t k = 0; k < exponent.size(); ++k) {
        const group& g = d_groups[d_components[k].group];
        d_share.push_back(k == g.first ? defence * g.prior
                                       : (1 - defence) * std::exp(exponent[k] - top) / sum);
        up_to += d_share.back();
        d_up_to.push_back(up_to);
    }
}

const shift_mixture::component& shift_mixture::pick(double uniform) const
{
    const auto at = std::upper_bound(d_up_to.begin(), d_up_to.end(), uniform * d_up_to.back());
    return d_components[std::min<std::size_t>(static_cast<std::size_t>(at - d_up_to.begin()),
                                              d_up_to.size() - 1)];
}

double shift_mixture::weight(const component& from, complex noise) const
{
    const group& g = d_groups[from.group];
    double mixture = 0;
    for (std::uint32_t k = g.first; k < g.last; ++k) {
        const complex a = d_components[k].shift;
        mixture +=
            d_share[k] *
            std::exp((2 * (noise.real() * a.real() + noise.imag() * a.imag()) - std::norm(a)) / from.n0);
    }
    return d_up_to.back() * g.prior / mixture / d_unit;
}

} // namespace halfplane
