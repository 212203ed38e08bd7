// SPDX-License-Identifier: GPL-3.0-or-later
// rates: the predictor, from Es/N0 to a scene and its noise, averaged over the states of the channel.
#include "halfplane/rates.h"

#include "rate_sums.h"
#include "scene.h"

#include <algorithm>
#include <cmath>
#include <sstream>
#include <stdexcept>

namespace halfplane {

namespace {

void require_es_n0(double es_n0)
{
    if (std::isfinite(es_n0) && es_n0 > 0)
        return;
    std::ostringstream text;
    text << "Es/N0 must be a finite ratio above 0, got " << es_n0;
    throw std::invalid_argument(text.str());
}

unsigned parts_of(rung_name r, bool bits)
{
    switch (r) {
    case rung_name::exact:
        return bits ? part_exact_ber : part_exact_ser;
    case rung_name::facing:
        return part_facing;
    case rung_name::union_bound:
        return part_union;
    default:
        return part_nearest;
    }
}

/// Brings coordinates to magnitude 1 by a power of two, which is exact.
signal_set normalised(const signal_set &set)
{
    double largest = 0;
    for (const auto &p : set.points())
        largest = std::max({largest, std::abs(p.real()), std::abs(p.imag())});
    return set.scaled(std::ldexp(1.0, -std::ilogb(largest)));
}

} // namespace

/// Cells, walls and scene of one power diagram, tied together so that the scene's pointers stay good.
struct diagram {
    diagram(const signal_set &set, std::vector<double> weights)
        : regions(set.points(), weights), walls(build_walls(regions, set.labels()))
    {
        view.set = &set;
        view.regions = &regions;
        view.walls = &walls;
        for (std::size_t i = 0; i < set.size(); ++i) {
            const auto owner = weights.empty() ? i : regions.owner(set.points()[i]);
            view.arrivals.push_back({i, set.points()[i], set.priors()[i], owner});
        }
        view.weights = std::move(weights);
    }
    diagram(const diagram &) = delete;
    diagram &operator=(const diagram &) = delete;

    cells regions;
    std::vector<wall> walls;
    scene view;
};

struct predictor::impl {
    signal_set given, set; // as given, and with coordinates of magnitude 1
    std::shared_ptr<const law> channel;
    detector rule;
    std::unique_ptr<diagram> fixed; // where cells do not depend on N0

    impl(signal_set s, std::shared_ptr<const law> c, detector r)
        : given(std::move(s)), set(normalised(given)), channel(std::move(c)), rule(r)
    {
        if (!channel)
            throw std::invalid_argument("a predictor needs a channel law");
        if (rule == detector::automatic)
            rule = given.uniform() ? detector::ml : detector::map;
        if (moving()) {
            const auto why = channel->map_refusal();
            if (!why.empty())
                throw std::invalid_argument(why);
        } else {
            fixed = std::make_unique<diagram>(set, std::vector<double>{});
        }
    }

    /// True where the cells move with N0.
    bool moving() const { return rule == detector::map && !given.uniform(); }

    std::unique_ptr<diagram> diagram_at(double n0) const
    {
        std::vector<double> weights;
        for (const double p : set.priors())
            weights.push_back(n0 * std::log(p));
        return std::make_unique<diagram>(set, std::move(weights));
    }

    /// Figures at one known gain of the channel.
    rate_sums gaussian(double es_n0, unsigned parts) const
    {
        const double n0 = set.es() / es_n0;
        const noise n{std::sqrt(2 / n0)};
        return fixed ? evaluate(fixed->view, n, parts) : evaluate(diagram_at(n0)->view, n, parts);
    }

    rate_sums at(double es_n0, unsigned parts) const
    {
        require_es_n0(es_n0);
        const auto &states = channel->states();
        if (!states.empty()) {
            rate_sums sum;
            for (const auto &s : states)
                sum.add(s.probability, gaussian(es_n0 * s.gain, parts));
            return sum;
        }
        return evaluate(fixed->view, noise{std::sqrt(2 * es_n0 / set.es()), channel.get()}, parts);
    }
};

predictor::predictor(signal_set set, std::shared_ptr<const law> channel, detector rule)
    : d(std::make_unique<impl>(std::move(set), std::move(channel), rule))
{
}
predictor::~predictor() = default;
predictor::predictor(predictor &&) noexcept = default;
predictor &predictor::operator=(predictor &&) noexcept = default;

const signal_set &predictor::set() const noexcept
{
    return d->given;
}

const law &predictor::channel() const noexcept
{
    return *d->channel;
}

detector predictor::rule() const noexcept
{
    return d->rule;
}

rates predictor::at(double es_n0) const
{
    return d->at(es_n0, part_all).finish(d->set.label_bits());
}

double predictor::ser(double es_n0, rung_name r) const
{
    return std::exp(ln_ser(es_n0, r));
}

double predictor::ber(double es_n0, rung_name r) const
{
    return std::exp(ln_ber(es_n0, r));
}

double predictor::ln_ser(double es_n0, rung_name r) const
{
    const auto sums = d->at(es_n0, parts_of(r, false));
    return std::log(sums.of(r).ser) + sums.ln_scale;
}

double predictor::ln_ber(double es_n0, rung_name r) const
{
    const auto sums = d->at(es_n0, parts_of(r, true));
    return std::log(sums.of(r).ber) + sums.ln_scale;
}

std::vector<double> predictor::transition_row(double es_n0, std::size_t i) const
{
    require_es_n0(es_n0);
    if (i >= d->set.size())
        throw std::out_of_range("no point " + std::to_string(i) + " in a set of " +
                                std::to_string(d->set.size()));
    std::vector<double> row(d->set.size(), 0);
    for (const auto &s : d->channel->states()) {
        const double n0 = d->set.es() / (es_n0 * s.gain);
        const noise n{std::sqrt(2 / n0)};
        const auto moved = d->fixed ? nullptr : d->diagram_at(n0);
        const scene &view = moved ? moved->view : d->fixed->view;
        const auto part = transitions(view, n, view.arrivals[i]);
        for (std::size_t j = 0; j < row.size(); ++j)
            row[j] += s.probability * part[j];
    }
    return row;
}

std::vector<std::size_t> predictor::facing(double es_n0, std::size_t i) const
{
    require_es_n0(es_n0);
    if (i >= d->set.size())
        throw std::out_of_range("no point " + std::to_string(i) + " in a set of " +
                                std::to_string(d->set.size()));
    return d->fixed ? d->fixed->regions.facing(i) : d->diagram_at(d->set.es() / es_n0)->regions.facing(i);
}

} // namespace halfplane
