// SPDX-License-Identifier: GPL-3.0-or-later
// predictor_impl: planes, diagrams and the average over the states of the channel.
#include "predictor_impl.h"

#include "fade_average.h"

#include <algorithm>
#include <cmath>
#include <sstream>
#include <stdexcept>

namespace halfplane {

namespace {

complex apply(const matrix2& a, complex z)
{
    return {a[0] * z.real() + a[1] * z.imag(), a[2] * z.real() + a[3] * z.imag()};
}

/// A power of two, so that scaling by it is exact.
double scale_to_one(const signal_set& set)
{
    double largest = 0;
    for (const auto& p : set.points())
        largest = std::max({largest, std::abs(p.real()), std::abs(p.imag())});
    return std::ldexp(1.0, -std::ilogb(largest));
}

/// (2C/tr C)^(−1/2): after it the noise has the same N0 and is circular.
std::unique_ptr<matrix2> whitening(const noise_shape& shape)
{
    if (shape.circular() && shape.ii > 0 && std::isfinite(shape.ii))
        return nullptr;
    const double trace = shape.ii + shape.qq;
    const double a = 2 * shape.ii / trace, b = 2 * shape.iq / trace, c = 2 * shape.qq / trace;
    const double det = a * c - b * b;
    if (!(shape.ii > 0 && shape.qq > 0 && std::isfinite(trace) && std::isfinite(shape.iq) && det > 1e-12)) {
        std::ostringstream text;
        text << "the covariance of the noise must be positive definite, got ii " << shape.ii << ", iq "
             << shape.iq << ", qq " << shape.qq;
        throw std::invalid_argument(text.str());
    }
    // Square root of a 2×2 matrix X: (X + √det·1)/√(tr X + 2√det); then its inverse.
    const double root = std::sqrt(det), norm = std::sqrt(a + c + 2 * root);
    const double p = (a + root) / norm, q = b / norm, r = (c + root) / norm;
    return std::make_unique<matrix2>(matrix2{r / root, -q / root, -q / root, p / root});
}

signal_set mapped(const signal_set& set, const matrix2& a)
{
    std::vector<complex> points;
    for (const auto& p : set.points())
        points.push_back(apply(a, p));
    return {std::move(points),
            set.labels(),
            set.label_bits(),
            set.uniform() ? std::vector<double>{} : set.priors()};
}

} // namespace

void require_es_n0(double es_n0)
{
    if (std::isfinite(es_n0) && es_n0 > 0)
        return;
    std::ostringstream text;
    text << "Es/N0 must be a finite ratio above 0, got " << es_n0;
    throw std::invalid_argument(text.str());
}

diagram::diagram(const signal_set& set, std::vector<double> weights, const matrix2* whiten)
    : regions(set.points(), weights), d_whiten(whiten)
{
    if (whiten)
        regions = regions.mapped(*whiten);
    walls = build_walls(regions, set.labels(), set.label_bits());
    view.set = &set;
    view.regions = &regions;
    view.walls = &walls;
    view.weights = std::move(weights);
    view.whiten = whiten;
    if (!moved()) {
        repeated = find_repetitions(set, regions);
        view.repeated = repeated.get();
    }
    for (std::size_t i = 0; i < set.size(); ++i) {
        const complex p = set.points()[i];
        view.arrivals.push_back(moved() ? arriving(i, p, set.priors()[i])
                                        : arrival{i, p, set.priors()[i], i});
    }
}

double diagram::room(std::size_t owner, complex mean) const
{
    double least = INFINITY;
    for (auto k = regions.begin_of(owner); k != regions.end_of(owner); ++k) {
        const auto& e = regions.edges()[*k];
        least = std::min(least, (e.inner == owner ? 1 : -1) * e.seen_from(mean).height);
    }
    return least;
}

arrival diagram::arriving(std::size_t sent, complex mean, double weight) const
{
    constexpr double border = 1e-14;
    const complex seen = d_whiten ? apply(*d_whiten, mean) : mean;
    // Most means lie in the cell of what was sent; to look there first spares the search among all points.
    const double in_own = room(sent, seen);
    const bool at_home = in_own > border && std::isfinite(in_own); // infinite: no cell at all
    const auto owner = at_home ? sent : regions.owner(mean);
    mean = seen;
    // On a border the sides of the edges must agree with the owner: a step into its cell, far below what any
    // rate can show, settles it.
    if (room(owner, mean) < border) {
        const complex inward = regions.inside(owner) - mean;
        mean += 3 * border / std::abs(inward) * inward;
    }
    return {sent, mean, weight, owner};
}

void diagram::add_arrival(
    std::size_t sent, complex mean, double weight, double deviation, std::vector<arrival>& out) const
{
    // Close to a corner the rounding of its place turns the angles under which edges are seen. Rates are
    // smooth in the mean, so half the weight a step to either side errs by the square of the step only. The
    // step balances both errors, its direction is one in which nothing lies by design.
    const double step = 1e-5 * std::pow(deviation, 2.0 / 3);
    const auto plain = arriving(sent, mean, weight);
    if (room(plain.owner, plain.mean) > step) {
        out.push_back(plain);
        return;
    }
    const complex aside = std::polar(step, 0.7391);
    out.push_back(arriving(sent, mean + aside, weight / 2));
    out.push_back(arriving(sent, mean - aside, weight / 2));
}

scene diagram::displaced(std::vector<arrival> arrivals) const
{
    scene out = view;
    out.arrivals = std::move(arrivals);
    out.undisplaced = false;
    return out;
}

predictor::impl::impl(signal_set s, std::shared_ptr<const law> c, detector r, noise_shape shape)
    : given(std::move(s)),
      rule(r == detector::automatic ? (given.uniform() ? detector::ml : detector::map) : r),
      channel(std::move(c)), scale(scale_to_one(given)), es(given.es() * scale * scale),
      shaped(whitening(shape)),
      to_detector(shaped && shape.decision == metric::matched ? *shaped : matrix2{1, 0, 0, 1}),
      set(shaped && shape.decision == metric::matched ? mapped(given.scaled(scale), *shaped)
                                                      : given.scaled(scale))
{
    if (!channel)
        throw std::invalid_argument("a predictor needs a channel law");
    if (shape.decision == metric::nearest)
        whiten = std::move(shaped);
    if (!moving())
        fixed = std::make_unique<diagram>(set, std::vector<double>{}, whiten.get());
    else if (!channel->map_refusal().empty())
        throw std::invalid_argument(channel->map_refusal());
}

noise predictor::impl::gaussian(double es_n0) const
{
    return {std::sqrt(2 * es_n0 / es)};
}

const diagram& predictor::impl::diagram_at(double es_n0, std::unique_ptr<diagram>& made) const
{
    if (fixed)
        return *fixed;
    std::vector<double> weights;
    for (const double p : set.priors())
        weights.push_back(es / es_n0 * std::log(p));
    made = std::make_unique<diagram>(set, std::move(weights), whiten.get());
    return *made;
}

rate_sums predictor::impl::averaged(double es_n0, const figures& f) const
{
    require_es_n0(es_n0);
    const auto at_gain = [&](double gain) {
        std::unique_ptr<diagram> made;
        const auto& d = diagram_at(es_n0 * gain, made);
        return f(d, gaussian(es_n0 * gain));
    };
    const auto& states = channel->states();
    if (states.empty()) {
        if (!fixed)
            return average_over_fade(*channel, at_gain);
        return f(*fixed, noise{gaussian(es_n0).per_unit, channel.get()});
    }
    // Likeliest first; what the rest could still add is bounded by its probability times the largest figure.
    std::vector<double> left(states.size() + 1, 0);
    for (std::size_t k = states.size(); k-- > 0;)
        left[k] = left[k + 1] + states[k].probability;
    rate_sums sum;
    for (std::size_t k = 0; k < states.size(); ++k) {
        sum.add(states[k].probability, at_gain(states[k].gain));
        const double ln_rest = std::log(left[k + 1] * static_cast<double>(set.size()));
        if (ln_rest < std::log(1e-17 * sum.least()) + sum.ln_scale)
            break;
    }
    return sum;
}

rate_sums predictor::impl::at(double es_n0, unsigned parts) const
{
    return averaged(es_n0, [&](const diagram& d, const noise& n) { return evaluate(d.view, n, parts); });
}

rate_sums
predictor::impl::displaced(double es_n0, const std::vector<displaced_point>& arrivals, unsigned parts) const
{
    return averaged(es_n0, [&](const diagram& d, const noise& n) {
        std::vector<arrival> placed;
        for (const auto& a : arrivals)
            if (a.weight > 0)
                d.add_arrival(a.sent, apply(to_detector, a.mean * scale), a.weight, 1 / n.per_unit, placed);
        return evaluate(d.displaced(std::move(placed)), n, parts);
    });
}

std::vector<double> predictor::impl::rows(double es_n0, const std::vector<std::size_t>& sent) const
{
    const std::size_t m = set.size();
    return averaged(es_n0,
                    [&](const diagram& d, const noise& n) {
                        std::vector<arrival> from;
                        for (const auto i : sent)
                            from.push_back(d.view.arrivals[i]);
                        rate_sums out;
                        out.by_point = transition_masses(d.view, n, from);
                        // For the average over a fade to see both what errs and what does not.
                        for (std::size_t k = 0; k < out.by_point.size(); ++k)
                            (k % m == sent[k / m] ? out.exact.ber : out.exact.ser) += out.by_point[k];
                        return out;
                    })
        .finish(set.label_bits())
        .exact.ser_by_point;
}

void predictor::impl::require_index(std::size_t i) const
{
    if (i >= set.size())
        throw std::out_of_range("no point " + std::to_string(i) + " in a set of " +
                                std::to_string(set.size()));
}

double predictor::impl::ln_rate(double es_n0, rung_name r, bool bits) const
{
    unsigned parts = part_nearest;
    if (r == rung_name::exact)
        parts = bits ? part_exact_ber : part_exact_ser;
    else if (r == rung_name::facing)
        parts = part_facing;
    else if (r == rung_name::union_bound)
        parts = part_union;
    const auto sums = at(es_n0, parts);
    return std::log(bits ? sums.of(r).ber : sums.of(r).ser) + sums.ln_scale;
}

} // namespace halfplane
