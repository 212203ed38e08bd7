// SPDX-License-Identifier: GPL-3.0-or-later
#include "link_model.h"

#include "halfplane/kernels/error_count.h"
#include "halfplane/kernels/noise.h"
#include "halfplane/kernels/random_words.h"
#include "streams.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>
#include <string>

namespace halfplane {

namespace {

constexpr unsigned guide_bits = 12;

[[noreturn]] void refuse(const std::string& what)
{
    throw std::invalid_argument("simulate: " + what);
}

const simulation_options& checked(const signal_set& set, const simulation_options& o)
{
    if (!(o.es_n0 > 0) || !std::isfinite(o.es_n0))
        refuse("es_n0 must be positive and finite, not " + std::to_string(o.es_n0));
    if (!o.channel)
        refuse("channel is missing");
    if (o.max_symbols == 0)
        refuse("max_symbols must be positive");
    if (!(o.relative_width >= 0) || !std::isfinite(o.relative_width))
        refuse("relative_width must be finite and not negative, not " + std::to_string(o.relative_width));
    if (!o.means.empty() && o.means.size() != set.size())
        refuse("means has " + std::to_string(o.means.size()) + " values for " + std::to_string(set.size()) +
               " points");
    for (std::size_t i = 0; i < o.means.size(); ++i)
        if (!std::isfinite(o.means[i].real()) || !std::isfinite(o.means[i].imag()))
            refuse("means[" + std::to_string(i) + "] is not finite");
    if (!(set.es() > 0))
        refuse("the set has no energy, so that no Es/N0 can be given");
    return o;
}

bool wants_map(const signal_set& set, const simulation_options& o)
{
    const bool map = !set.uniform() && o.rule != detector::ml;
    if (map && !o.channel->map_refusal().empty())
        refuse("detector map: " + o.channel->map_refusal());
    return map;
}

} // namespace

link_model::link_model(const signal_set& set, const simulation_options& options)
    : d_set(set), d_means(checked(set, options).means.empty() ? set.points() : options.means),
      d_seed(options.seed), d_n0(set.es() / options.es_n0), d_map_rule(wants_map(set, options)),
      d_gain(gain_sampler::of(*options.channel)),
      d_decider(d_map_rule && !d_gain ? kernels::point_decider(set, d_n0) : kernels::point_decider(set))
{
    for (const complex m : d_means)
        d_sent.emplace_back(static_cast<float>(m.real()), static_cast<float>(m.imag()));
    if (set.uniform())
        return;
    double up_to = 0;
    for (const double p : set.priors()) {
        up_to += p;
        d_limit.push_back(static_cast<std::uint64_t>(std::ldexp(up_to, 32)));
    }
    d_limit.back() = std::uint64_t{1} << 32;
    std::uint16_t index = 0;
    for (std::uint64_t top = 0; top < 1u << guide_bits; ++top) {
        while (d_limit[index] <= top << (32 - guide_bits))
            ++index;
        d_start.push_back(index);
    }
}

namespace {

/// Four symbols a word, for sets of equal priors and a power of two of at most 256 points: a byte's low bits
/// each. `first` a multiple of 4.
void symbols_of_bytes(const kernels::random_words& words,
                      std::uint64_t first,
                      std::size_t count,
                      std::size_t size,
                      std::uint16_t* index)
{
    std::uint32_t word[link_model::block / 4 + 1];
    words.draw(first / 4, (count + 3) / 4, word);
    const auto mask = static_cast<std::uint32_t>(size - 1);
    std::size_t k = 0;
    for (; k + 4 <= count; k += 4)
        for (unsigned byte = 0; byte < 4; ++byte)
            index[k + byte] = static_cast<std::uint16_t>(word[k / 4] >> 8 * byte & mask);
    for (; k < count; ++k)
        index[k] = static_cast<std::uint16_t>(word[k / 4] >> 8 * (k % 4) & mask);
}

} // namespace

void link_model::draw_symbols(std::uint64_t first, std::size_t count, std::uint16_t* index) const
{
    if (const auto size = d_set.size(); d_limit.empty() && size <= 256 && (size & (size - 1)) == 0) {
        symbols_of_bytes(kernels::random_words(d_seed, streams::symbols), first, count, size, index);
        return;
    }
    std::uint32_t word[block];
    kernels::random_words(d_seed, streams::symbols).draw(first, count, word);
    if (d_limit.empty()) {
        const std::uint64_t size = d_set.size();
        for (std::size_t k = 0; k < count; ++k)
            index[k] = static_cast<std::uint16_t>(word[k] * size >> 32);
        return;
    }
    for (std::size_t k = 0; k < count; ++k) {
        std::uint16_t i = d_start[word[k] >> (32 - guide_bits)];
        while (word[k] >= d_limit[i])
            ++i;
        index[k] = i;
    }
}

/// Gain and noise, divided by the known gain: r = m + n/√G.
void link_model::receive_faded(std::uint64_t first,
                               std::size_t count,
                               std::complex<float>* samples,
                               double* gain) const
{
    std::complex<float> noise[block];
    d_gain->draw(d_seed, first, count, gain);
    kernels::complex_noise(d_seed, streams::noise).draw(first, count, d_n0, noise);
    for (std::size_t k = 0; k < count; ++k)
        samples[k] += noise[k] * static_cast<float>(1 / std::sqrt(gain[k]));
}

/// MAP at the noise density of this gain; the thresholds move with every symbol, so all points are compared.
std::uint16_t link_model::decide_faded(std::complex<float> sample, double gain) const
{
    const double x = sample.real(), y = sample.imag(), half_n0 = d_n0 / gain / 2;
    if (!std::isfinite(x) || !std::isfinite(y))
        return kernels::point_decider::nonfinite;
    std::size_t best = 0;
    double top = 0;
    for (std::size_t i = 0; i < d_set.size(); ++i) {
        const complex s = d_set.points()[i];
        const double value =
            x * s.real() + y * s.imag() - std::norm(s) / 2 + half_n0 * std::log(d_set.priors()[i]);
        if (i == 0 || value > top)
            top = value, best = i;
    }
    return static_cast<std::uint16_t>(best);
}

void link_model::count(std::uint64_t first, std::uint64_t count, tally& to) const
{
    std::uint16_t sent[block], decided[block];
    std::complex<float> samples[block];
    std::vector<double> gain(d_gain ? block : 0);
    const kernels::complex_noise noise(d_seed, streams::noise);
    while (count > 0) {
        const auto n = static_cast<std::size_t>(std::min<std::uint64_t>(count, block));
        draw_symbols(first, n, sent);
        for (std::size_t k = 0; k < n; ++k)
            samples[k] = d_sent[sent[k]];
        if (d_gain)
            receive_faded(first, n, samples, gain.data());
        else
            noise.add(first, n, d_n0, samples);
        if (d_gain && d_map_rule)
            for (std::size_t k = 0; k < n; ++k)
                decided[k] = decide_faded(samples[k], gain[k]);
        else
            d_decider.decide(samples, decided, n);
        to.count(sent, decided, n);
        first += n, count -= n;
    }
}

} // namespace halfplane
