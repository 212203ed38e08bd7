// SPDX-License-Identifier: GPL-3.0-or-later
// align_link: a simulated link for the aligner's tests: known symbols through gain, phase, frequency, mirror
// and noise.
#pragma once

#include "halfplane/kernels/detect.h"
#include "halfplane/kernels/noise.h"
#include "halfplane/link/aligner.h"
#include "halfplane/set_file.h"

#include <cmath>
#include <complex>
#include <cstdint>
#include <random>
#include <string>
#include <vector>

namespace align_test {

using halfplane::complex;
using halfplane::pattern;
using halfplane::signal_set;
using halfplane::link::aligner;
using halfplane::link::aligner_options;
using sample = std::complex<float>;

struct channel {
    double es_n0_db = 20;
    complex gain{1, 0};
    double frequency = 0; ///< cycles a symbol, before a mirror
    bool mirrored = false, inverted = false;
    std::uint64_t seed = 1;
};

/// Indices of pattern symbols first … first + count − 1, with all bits inverted on request.
inline std::vector<std::uint16_t> symbols(
    const signal_set& set, const pattern& p, std::uint64_t first, std::size_t count, bool inverted = false)
{
    std::vector<std::uint16_t> sent(count);
    p.indices(first, count, sent.data());
    const unsigned all = (1u << set.label_bits()) - 1;
    if (inverted)
        for (auto& i : sent)
            i = static_cast<std::uint16_t>(set.index_of_label(set.labels()[i] ^ all));
    return sent;
}

/// The symbols on air: symbol k of the stream is sample k.
inline std::vector<sample>
through(const signal_set& set, const std::vector<std::uint16_t>& sent, const channel& c)
{
    const double n0 = set.es() * std::pow(10, -c.es_n0_db / 10);
    std::vector<sample> r(sent.size());
    halfplane::kernels::complex_noise(c.seed).draw(0, r.size(), n0, r.data());
    for (std::size_t k = 0; k < r.size(); ++k) {
        const complex on_air = set.points()[sent[k]] + complex(r[k]);
        const complex turned =
            on_air * c.gain * std::polar(1.0, 2 * M_PI * c.frequency * static_cast<double>(k));
        r[k] = sample(c.mirrored ? std::conj(turned) : turned);
    }
    return r;
}

struct outcome {
    std::vector<sample> out;
    std::vector<halfplane::reference_t> reference;
    std::vector<halfplane::link::lock_event> events;
    halfplane::link::lock_status status;
    bool lengths_hold = true; ///< written = max(0, taken − holdback) after every call

    std::uint64_t count(halfplane::exclusion e) const
    {
        std::uint64_t n = 0;
        for (auto r : reference)
            n += r == halfplane::code(e);
        return n;
    }
    std::uint64_t judged() const
    {
        std::uint64_t n = 0;
        for (auto r : reference)
            n += r >= 0;
        return n;
    }
};

/// Everything through an aligner, in pieces of awkward length; `overflows`: samples before which a gap is
/// marked.
inline outcome run(aligner& a, const std::vector<sample>& r, std::vector<std::size_t> overflows = {})
{
    outcome o;
    o.out.resize(r.size());
    o.reference.resize(r.size());
    std::size_t at = 0, written = 0;
    const std::size_t lengths[] = {1000, 1, 7, 4096, 333, 8191};
    for (std::size_t turn = 0; at < r.size(); ++turn) {
        std::size_t n = std::min(lengths[turn % 6], r.size() - at);
        if (!overflows.empty()) {
            if (overflows.front() == at) {
                a.mark_overflow();
                overflows.erase(overflows.begin());
            }
            if (!overflows.empty())
                n = std::min(n, overflows.front() - at);
        }
        written += a.process(&r[at], n, &o.out[written], &o.reference[written]);
        at += n;
        o.lengths_hold = o.lengths_hold && written == (at > aligner::holdback ? at - aligner::holdback : 0) &&
                         a.taken() == at && a.written() == written;
        for (auto& e : a.take_events())
            o.events.push_back(e);
    }
    written += a.finish(&o.out[written], &o.reference[written]);
    for (auto& e : a.take_events())
        o.events.push_back(e);
    o.lengths_hold = o.lengths_hold && written == r.size();
    o.status = a.status();
    return o;
}

/// First symbol of the first lock; the number of samples where there was none.
inline std::uint64_t first_lock(const outcome& o)
{
    for (const auto& e : o.events)
        if (e.status.state == halfplane::link::lock_state::held)
            return e.symbol;
    return o.out.size();
}

/// Symbol errors among judged symbols of begin … end − 1 by nearest point.
inline std::uint64_t errors(const signal_set& set, const outcome& o, std::size_t begin, std::size_t end)
{
    std::vector<std::uint16_t> decided(end - begin);
    halfplane::kernels::point_decider(set).decide(&o.out[begin], decided.data(), end - begin);
    std::uint64_t n = 0;
    for (std::size_t k = begin; k < end; ++k)
        n += o.reference[k] >= 0 && decided[k - begin] != o.reference[k];
    return n;
}

inline signal_set firn12()
{
    return halfplane::load_set(std::string(HALFPLANE_SOURCE_DIR) + "/examples/sets/firn-12.json");
}

/// Seven points without any symmetry, natural labels.
inline signal_set scattered7()
{
    return signal_set::with_natural_labels(
        {{1.9, 0.2}, {0.4, 1.7}, {-1.3, 1.2}, {-1.8, -0.9}, {0.1, -1.6}, {1.3, -1.4}, {0.2, 0.1}});
}

/// Hypotheses of one seeded try.
struct try_of {
    channel c;
    std::uint64_t start;
    explicit try_of(std::uint64_t seed, double es_n0_db, const pattern& p, bool may_mirror, bool may_invert)
    {
        std::mt19937_64 random(seed);
        std::uniform_real_distribution<double> unit(0, 1);
        c.es_n0_db = es_n0_db;
        c.gain = std::polar(std::pow(10, 4 * unit(random) - 2), 2 * M_PI * unit(random));
        c.frequency = 2e-4 * unit(random) - 1e-4;
        c.mirrored = may_mirror && unit(random) < 0.5;
        c.inverted = may_invert && unit(random) < 0.5;
        c.seed = seed;
        start = random() % p.period();
    }
};

} // namespace align_test
