// SPDX-License-Identifier: GPL-3.0-or-later
// align_track: fading least squares with a second-order phase loop, and a cumulative test for the pattern's
// presence.
#include "align_track.h"

#include <algorithm>

namespace halfplane::link {

tracker::tracker(const signal_set& set, std::size_t memory)
    : d_es(set.es()), d_mean(set.mean()), d_memory(memory), d_chunk(1)
{
    while (d_chunk < longest_chunk && d_chunk * 16 <= memory)
        d_chunk *= 2;
}

void tracker::start(complex gain, double frequency, double coefficient, double weight)
{
    d_gain = gain;
    d_frequency = frequency;
    d_past = {};
    d_past.n = std::clamp(weight, 1.0, static_cast<double>(d_memory));
    d_past.s = d_mean * d_past.n;
    d_past.ss = d_es * d_past.n;
    d_past.r = gain * d_past.s;
    d_past.rs = gain * d_past.ss;
    trust(coefficient);
}

void tracker::turn(complex ratio)
{
    d_gain *= ratio;
    d_past.r *= ratio;
    d_past.rs *= ratio;
}

void tracker::trust(double coefficient)
{
    d_usual = std::clamp(coefficient, 0.01, 1.0);
    d_suspicion = 0;
    d_weighed = {};
    d_since = 0;
}

void tracker::correct(
    const sample* r, const std::uint16_t* sent, const sample* points, std::size_t count, sample* y)
{
    phasors(0, -2 * M_PI * d_frequency, count, d_phasor.data());
    const sample scale(1.0 / d_gain);
    for (std::size_t k = 0; k < count; ++k)
        d_turned[k] = times(r[k], d_phasor[k]);
    for (std::size_t k = 0; k < count; ++k)
        y[k] = times(d_turned[k], scale);
    d_now = {};
    d_now.add(d_turned.data(), sent, points, count);
    d_count = count;
}

void tracker::advance(bool frozen)
{
    const auto count = static_cast<double>(d_count);
    // In units of the corrected sample, so that chunks under different gains add up.
    moments seen = d_now;
    seen.rs /= d_gain;
    seen.r /= d_gain;
    seen.rr /= std::norm(d_gain);
    d_weighed += seen;

    // One chunk's own correlation coefficient, along the present phase.
    const double energy = std::sqrt(seen.sent() * seen.received());
    const double along = energy > 0 ? seen.cross().real() / energy : 0;
    const double spread = 1 / std::sqrt(2 * count);
    const bool suspect = !(along > d_usual / 2 - 2 * spread) || !std::isfinite(energy);

    if (!frozen && !suspect) {
        const double kept = std::exp(-count / static_cast<double>(d_memory)), taken = 1 - kept;
        const complex error = (seen.rs - seen.r * std::conj(d_past.n > 0 ? d_past.s / d_past.n : complex{})) /
                              std::max(seen.ss, count * d_es / 2);
        d_past.n *= kept;
        d_past.rr *= kept;
        d_past.ss *= kept;
        d_past.rs *= kept;
        d_past.r *= kept;
        d_past.s *= kept;
        d_past += d_now;
        if (d_past.sent() > 0)
            d_gain = d_past.cross() / d_past.sent();
        d_frequency += taken * taken / 8 * std::clamp(error.imag(), -1.0, 1.0) / (2 * M_PI * count);
    }
    const complex on = std::polar(1.0, 2 * M_PI * d_frequency * count);
    d_gain *= on;
    d_past.r *= on;
    d_past.rs *= on;

    d_since += d_count;
    if (d_since >= weighed)
        weigh();
}

void tracker::weigh()
{
    // The coefficient of n symbols is Gaussian about its usual value, or about 0 where the pattern is gone,
    // with variance 1/(2n) (an upper bound for the former): a cumulative sum of the log-likelihood ratio (E.
    // S. Page, Biometrika 41 (1954) 100).
    const double energy = std::sqrt(d_weighed.sent() * d_weighed.received());
    const double along = energy > 0 ? d_weighed.cross().real() / energy : 0;
    const double gone = (d_usual / 2 - along) * d_usual * 2 * static_cast<double>(d_since);
    d_suspicion = std::max(0.0, d_suspicion + gone);
    if (d_suspicion == 0)
        d_usual = std::clamp(d_usual + (along - d_usual) / 16, 0.01, 1.0);
    d_weighed = {};
    d_since = 0;
}

} // namespace halfplane::link
