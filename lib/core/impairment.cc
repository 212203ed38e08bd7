// SPDX-License-Identifier: GPL-3.0-or-later
// impairment: samples of neighbours and phase, averaged by the exact rate of displaced means.
#include "impairment.h"

#include <boost/math/distributions/normal.hpp>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <random>

namespace halfplane {

namespace {

constexpr std::size_t least_samples = 4; // a point
constexpr std::size_t phase_nodes = 64;  // trapezoid over a Gaussian: converges geometrically
constexpr double phase_reach = 7;        // standard deviations: 2.6e-12 of the phases lie beyond
constexpr double phase_spread = 1.4;     // samples are drawn wider than the phase, and weigh less far out

struct phase_sample {
    double z, weight; // in standard deviations
};

/// Alone, the phase is integrated over; beside neighbours it is one more dimension of the sample.
std::vector<phase_sample> phases(std::size_t count, bool alone)
{
    const boost::math::normal gaussian;
    std::vector<phase_sample> out;
    for (std::size_t t = 0; t < count; ++t) {
        const double u = (static_cast<double>(t) + 0.5) / static_cast<double>(count);
        const double wide = alone ? 0 : boost::math::quantile(gaussian, u);
        const double z = alone ? phase_reach * (2 * u - 1) : phase_spread * wide;
        out.push_back({z, std::exp((wide * wide - z * z) / 2)});
    }
    return out;
}

/// 0 … n−1 in a random order, by our own shuffle: the library's differs between implementations.
std::vector<std::size_t> shuffled(std::size_t n, std::mt19937_64& random)
{
    std::vector<std::size_t> order(n);
    std::iota(order.begin(), order.end(), std::size_t{0});
    for (std::size_t k = n; k > 1; --k)
        std::swap(order[k - 1], order[random() % k]);
    return order;
}

/// Index by prior at a place u of [0, 1).
class quantile_of_points
{
public:
    explicit quantile_of_points(const signal_set& set) : d_ends(set.size())
    {
        std::partial_sum(set.priors().begin(), set.priors().end(), d_ends.begin());
    }
    std::size_t operator()(double u) const
    {
        const auto at = std::upper_bound(d_ends.begin(), d_ends.end(), u);
        return std::min(static_cast<std::size_t>(at - d_ends.begin()), d_ends.size() - 1);
    }

private:
    std::vector<double> d_ends;
};

} // namespace

bool impairment::random() const
{
    return phase_variance > 0 ||
           std::any_of(taps.begin(), taps.end(), [](complex t) { return t != complex{}; });
}

double ln_ser(const predictor& p, const impairment& what)
{
    const auto& set = p.set();
    const double scale = std::sqrt(set.es()), deviation = std::sqrt(what.phase_variance);
    std::vector<std::size_t> active;
    for (std::size_t l = 0; l < what.taps.size(); ++l)
        if (what.taps[l] != complex{})
            active.push_back(l);

    std::size_t samples = 1;
    if (!active.empty())
        samples = std::max(least_samples, impairment_arrivals / set.size());
    else if (deviation > 0)
        samples = phase_nodes;

    double kappa = 0;
    for (std::size_t i = 0; i < set.size(); ++i)
        kappa += set.priors()[i] * std::pow(std::norm(set.points()[i]) / set.es(), 2);
    const quantile_of_points point_at(set);
    const auto of_phase = phases(samples, active.empty());
    std::mt19937_64 random(1);
    std::vector<displaced_point> arrivals;
    arrivals.reserve(samples * set.size());
    std::vector<double> weights(samples);
    std::vector<complex> disturbed(samples), turned(samples);
    for (std::size_t i = 0; i < set.size(); ++i) {
        const complex s = set.points()[i] / scale;
        const complex fixed =
            what.offset + what.image * std::conj(s) + what.curve * s * (std::norm(s) - kappa);
        std::fill(disturbed.begin(), disturbed.end(), fixed);
        std::fill(turned.begin(), turned.end(), complex(1));
        std::fill(weights.begin(), weights.end(), 1.0);
        for (const auto l : active) {
            const auto order = shuffled(samples, random);
            for (std::size_t t = 0; t < samples; ++t) {
                const double u = (static_cast<double>(order[t]) + 0.5) / static_cast<double>(samples);
                disturbed[t] += what.taps[l] * set.points()[point_at(u)] / scale;
            }
        }
        if (deviation > 0) {
            const auto order = active.empty() ? std::vector<std::size_t>{} : shuffled(samples, random);
            for (std::size_t t = 0; t < samples; ++t) {
                const auto& phase = of_phase[order.empty() ? t : order[t]];
                weights[t] = phase.weight;
                turned[t] = std::polar(std::exp(what.phase_variance / 2), phase.z * deviation);
            }
        }
        const double all = std::accumulate(weights.begin(), weights.end(), 0.0);
        for (std::size_t t = 0; t < samples; ++t)
            arrivals.push_back(
                {i, what.gain * (turned[t] * s + disturbed[t]) * scale, set.priors()[i] * weights[t] / all});
    }
    if (what.noise_square == complex{})
        return p.displaced_ln_ser(1 / what.n0, arrivals);
    // E[noise²] = E[I²] − E[Q²] + 2j·E[IQ]
    noise_shape shape;
    shape.ii = (1 + what.noise_square.real()) / 2;
    shape.qq = (1 - what.noise_square.real()) / 2;
    shape.iq = what.noise_square.imag() / 2;
    shape.decision = metric::nearest;
    return predictor(set, std::make_shared<awgn>(), p.rule(), shape).displaced_ln_ser(1 / what.n0, arrivals);
}

} // namespace halfplane
