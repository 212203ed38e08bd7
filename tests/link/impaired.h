// SPDX-License-Identifier: GPL-3.0-or-later
// A link with faults in a test: shaped pulses, an echo, a receiver that is late, turned, unbalanced or noisy
// in phase. Shares nothing with the library but the set's points.
#pragma once

#include "halfplane/signal_set.h"
#include "simulated.h"

#include <cmath>
#include <complex>
#include <random>
#include <vector>

namespace halfplane::testing {

struct faults {
    double gain = 1;            // of the receiver: acts on signal and noise
    double phase_deg = 0;       // standing
    double phase_noise_deg = 0; // rms, independent from symbol to symbol
    double imbalance_db = 0;    // gain of I over Q
    complex offset = 0;         // over √Es
    double compression = 0;     // s → s − c·s|s|²/Es at the sender
    complex echo = 0;           // of the symbol `echo_lag` before
    int echo_lag = 1;
    double delay = 0;            // of the sampling instant, in symbols, a multiple of 1/16
    double roll_off = 0.35;      // of the sender's root raised cosine
    double receive_roll_off = 0; // 0: the sender's
    bool shaped = false;         // pulses even where neither delay nor roll-off asks for them
    bool gain_control = false;   // brings the least-squares gain to 1
};

/// Root raised cosine at t symbols (3GPP TS 25.104, 6.8.1), not normalised.
inline double root_raised_cosine(double t, double a)
{
    const double pi = std::acos(-1.0);
    if (std::abs(t) < 1e-9)
        return 1 - a + 4 * a / pi;
    const double x = 4 * a * t;
    if (std::abs(std::abs(x) - 1) < 1e-9)
        return a / std::sqrt(2.0) *
               ((1 + 2 / pi) * std::sin(pi / (4 * a)) + (1 - 2 / pi) * std::cos(pi / (4 * a)));
    return (std::sin(pi * t * (1 - a)) + x * std::cos(pi * t * (1 + a))) / (pi * t * (1 - x * x));
}

/// Unit-energy pulse, 16 samples a symbol over ±`span` symbols.
class sampled_pulse
{
public:
    static constexpr int per_symbol = 16, span = 16;
    explicit sampled_pulse(double roll_off) : d_taps(2 * span * per_symbol + 1)
    {
        double energy = 0;
        for (std::size_t k = 0; k < d_taps.size(); ++k) {
            d_taps[k] = root_raised_cosine(static_cast<double>(k) / per_symbol - span, roll_off);
            energy += d_taps[k] * d_taps[k];
        }
        for (auto& t : d_taps)
            t /= std::sqrt(energy);
    }
    double at(int k) const
    {
        return std::abs(k) <= span * per_symbol ? d_taps[static_cast<std::size_t>(k + span * per_symbol)] : 0;
    }

private:
    std::vector<double> d_taps;
};

/// Signal through both pulses, and white noise of n0 through the receiver's, sampled `delay` symbols late.
inline std::vector<complex>
through_pulses(const std::vector<complex>& sent, const faults& f, double n0, std::mt19937_64& random)
{
    constexpr int per_symbol = sampled_pulse::per_symbol, span = sampled_pulse::span;
    const sampled_pulse out(f.roll_off), in(f.receive_roll_off > 0 ? f.receive_roll_off : f.roll_off);
    const int late = static_cast<int>(std::lround(f.delay * per_symbol));
    // Both pulses in one: the response at k symbols.
    std::vector<double> response;
    for (int k = -2 * span; k <= 2 * span; ++k) {
        double sum = 0;
        for (int t = -span * per_symbol; t <= span * per_symbol; ++t)
            sum += out.at(t) * in.at(k * per_symbol + late - t);
        response.push_back(sum);
    }
    // The noise in the receiver's filter: its own convolution, at a quarter of the samples (the band allows
    // it).
    constexpr int step = 4, noise_per_symbol = per_symbol / step;
    std::normal_distribution<double> normal;
    const int n = static_cast<int>(sent.size());
    std::vector<complex> noise(static_cast<std::size_t>((n + 2 * span) * noise_per_symbol));
    for (auto& x : noise) // a noise sample stands for `step` samples of the pulse of unit energy
        x = std::sqrt(n0 / 2 / step) * complex(normal(random), normal(random));
    std::vector<double> matched;
    for (int t = -span * noise_per_symbol; t < span * noise_per_symbol; ++t)
        matched.push_back(in.at(t * step) * step);
    std::vector<complex> got(sent.size());
    for (int k = 0; k < n; ++k) {
        complex y = 0;
        for (int lag = -2 * span; lag <= 2 * span; ++lag)
            if (k - lag >= 0 && k - lag < n)
                y += response[static_cast<std::size_t>(lag + 2 * span)] *
                     sent[static_cast<std::size_t>(k - lag)];
        const auto* from = &noise[static_cast<std::size_t>(k * noise_per_symbol)];
        for (std::size_t t = 0; t < matched.size(); ++t)
            y += matched[t] * from[t];
        got[static_cast<std::size_t>(k)] = y;
    }
    return got;
}

inline simulated
simulate(const signal_set& set, std::size_t n, double es_n0_db, const faults& f, std::uint64_t seed)
{
    std::mt19937_64 random(seed);
    std::discrete_distribution<int> index(set.priors().begin(), set.priors().end());
    std::normal_distribution<double> normal;
    const double es = set.es(), n0 = es / std::pow(10, es_n0_db / 10), turn = std::acos(-1.0) / 180;
    simulated link;
    std::vector<complex> s(n), x(n);
    for (std::size_t k = 0; k < n; ++k) {
        link.reference.push_back(static_cast<reference_t>(index(random)));
        s[k] = set.points()[static_cast<std::size_t>(link.reference[k])];
        x[k] = s[k] - f.compression * s[k] * std::norm(s[k]) / es;
    }
    if (f.echo != complex{}) {
        const auto before = x;
        for (std::size_t k = static_cast<std::size_t>(f.echo_lag); k < n; ++k)
            x[k] += f.echo * before[k - static_cast<std::size_t>(f.echo_lag)];
    }
    if (f.shaped || f.delay != 0 || f.receive_roll_off > 0)
        x = through_pulses(x, f, n0, random);
    else
        for (auto& y : x)
            y += std::sqrt(n0 / 2) * complex(normal(random), normal(random));
    const double i_gain = std::pow(10, f.imbalance_db / 40);
    complex rs = 0;
    double ss = 0;
    for (std::size_t k = 0; k < n; ++k) {
        x[k] *= f.gain * std::polar(1.0, turn * (f.phase_deg + f.phase_noise_deg * normal(random)));
        x[k] = complex(x[k].real() * i_gain, x[k].imag() / i_gain) + f.offset * std::sqrt(es);
        rs += x[k] * std::conj(s[k]);
        ss += std::norm(s[k]);
    }
    for (std::size_t k = 0; k < n; ++k)
        link.samples.emplace_back(f.gain_control ? x[k] * ss / rs : x[k]);
    return link;
}

} // namespace halfplane::testing
