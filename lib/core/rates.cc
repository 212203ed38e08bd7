// SPDX-License-Identifier: GPL-3.0-or-later
// rates: the predictor's public face.
#include "halfplane/rates.h"

#include "predictor_impl.h"

#include <cmath>
#include <functional>
#include <numeric>
#include <sstream>
#include <stdexcept>

namespace halfplane {

predictor::predictor(signal_set set, std::shared_ptr<const law> channel, detector rule, noise_shape shape)
    : d(std::make_unique<impl>(std::move(set), std::move(channel), rule, shape))
{
}
predictor::~predictor() = default;
predictor::predictor(predictor&&) noexcept = default;
predictor& predictor::operator=(predictor&&) noexcept = default;

const signal_set& predictor::set() const noexcept
{
    return d->given;
}

const law& predictor::channel() const noexcept
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
    return d->ln_rate(es_n0, r, false);
}

double predictor::ln_ber(double es_n0, rung_name r) const
{
    return d->ln_rate(es_n0, r, true);
}

std::vector<double> predictor::transition_row(double es_n0, std::size_t i) const
{
    d->require_index(i);
    return d->rows(es_n0, {i});
}

std::vector<double> predictor::transitions(double es_n0) const
{
    std::vector<std::size_t> all(d->set.size());
    std::iota(all.begin(), all.end(), std::size_t{0});
    return d->rows(es_n0, all);
}

std::vector<double> predictor::expected_counts(double es_n0, const std::vector<std::uint64_t>& sent) const
{
    const std::size_t m = d->set.size();
    if (sent.size() != m)
        throw std::invalid_argument("counts of " + std::to_string(sent.size()) + " points for a set of " +
                                    std::to_string(m));
    auto out = transitions(es_n0);
    for (std::size_t i = 0; i < m; ++i)
        for (std::size_t j = 0; j < m; ++j)
            out[i * m + j] *= static_cast<double>(sent[i]);
    return out;
}

exact_rung predictor::displaced(double es_n0, const std::vector<complex>& means) const
{
    if (means.size() != d->set.size())
        throw std::invalid_argument(std::to_string(means.size()) + " means for a set of " +
                                    std::to_string(d->set.size()) + " points");
    std::vector<displaced_point> arrivals;
    for (std::size_t i = 0; i < means.size(); ++i)
        arrivals.push_back({i, means[i], d->set.priors()[i]});
    return displaced_among(es_n0, arrivals);
}

namespace {

/// Finite means of points of the set, weights that sum to 1; else throws.
void check_arrivals(const std::vector<displaced_point>& arrivals,
                    const std::function<void(std::size_t)>& require_index)
{
    double sum = 0;
    for (std::size_t k = 0; k < arrivals.size(); ++k) {
        const auto& a = arrivals[k];
        require_index(a.sent);
        std::ostringstream text;
        if (!std::isfinite(a.mean.real()) || !std::isfinite(a.mean.imag()))
            text << "mean " << k << " is not finite: " << a.mean;
        else if (!(a.weight >= 0 && std::isfinite(a.weight)))
            text << "weight " << k << " must be a number of at least 0, got " << a.weight;
        if (text.tellp() > 0)
            throw std::invalid_argument(text.str());
        sum += a.weight;
    }
    if (!(std::abs(sum - 1) <= signal_set::prior_tolerance)) {
        std::ostringstream text;
        text << "the weights of displaced points must sum to 1, they sum to " << sum;
        throw std::invalid_argument(text.str());
    }
}

} // namespace

exact_rung predictor::displaced_among(double es_n0, const std::vector<displaced_point>& arrivals) const
{
    check_arrivals(arrivals, [&](std::size_t i) { d->require_index(i); });
    return d->displaced(es_n0, arrivals, part_exact_ser | part_exact_ber).finish(d->set.label_bits()).exact;
}

double predictor::displaced_ln_ser(double es_n0, const std::vector<displaced_point>& arrivals) const
{
    check_arrivals(arrivals, [&](std::size_t i) { d->require_index(i); });
    return d->displaced(es_n0, arrivals, part_exact_ser).finish(d->set.label_bits()).exact.ln_ser;
}

std::vector<std::size_t> predictor::facing(double es_n0, std::size_t i) const
{
    require_es_n0(es_n0);
    d->require_index(i);
    std::unique_ptr<diagram> made;
    return d->diagram_at(es_n0, made).regions.facing(i);
}

} // namespace halfplane
