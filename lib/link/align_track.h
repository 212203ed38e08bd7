// SPDX-License-Identifier: GPL-3.0-or-later
// align_track: the causal correction of gain, phase and frequency, and the sense of whether the pattern is
// still there.
#pragma once

#include "align_fit.h"

#include <array>

namespace halfplane::link {

/*!
 * Follows r = g·s + noise from past symbols only. Gain and phase are least squares over an exponential memory
 * of `memory` symbols (means taken out, so a standing offset is neither followed nor removed); frequency is
 * the second integrator of the same loop, with damping √2.
 *
 * A stretch that does not look like the pattern (a burst, silence, one giant sample) teaches it nothing.
 */
class tracker
{
public:
    /// Symbols handled as one; gain and frequency stand within.
    static constexpr std::size_t longest_chunk = 128;

    tracker(const signal_set& set, std::size_t memory);

    /// Largest chunk for this memory: a power of two, an eighth of the memory or less.
    std::size_t chunk() const noexcept { return d_chunk; }

    /// Begins anew: gain as of the next symbol, learnt from `weight` symbols, with this correlation
    /// coefficient.
    void start(complex gain, double frequency, double coefficient, double weight);
    /// Multiplies the gain: a phase or gain step found by other means.
    void turn(complex ratio);
    /// Sets what counts as the usual correlation coefficient and forgets all suspicion.
    void trust(double coefficient);

    /// Corrects the next `count` (≤ longest_chunk) samples: y = r/ĝ by what was known before them, and notes
    /// what they tell, given the indices sent. advance() must follow.
    void
    correct(const sample* r, const std::uint16_t* sent, const sample* points, std::size_t count, sample* y);
    /// On by the chunk just corrected; learns from it unless frozen or the chunk is suspect.
    void advance(bool frozen);

    complex gain() const noexcept { return d_gain; } ///< as of the next symbol
    double frequency() const noexcept { return d_frequency; }
    /// The usual correlation coefficient of samples and pattern, 0 … 1.
    double coefficient() const noexcept { return d_usual; }
    /// Log-likelihood that the pattern is gone against still there, since it last looked sound; 0 or more.
    double suspicion() const noexcept { return d_suspicion; }

    /// Symbols over which suspicion is weighed.
    static constexpr std::size_t weighed = 128;
    /// Suspicion that makes a lock doubtful: e^25 to one.
    static constexpr double doubtful = 25;

private:
    void weigh();

    const double d_es;
    const complex d_mean;
    std::size_t d_memory, d_chunk;
    complex d_gain{1, 0};
    double d_frequency = 0, d_usual = 1, d_suspicion = 0;
    moments d_past;          ///< fading sums, turned to the phase of the next symbol
    moments d_now;           ///< of the chunk, turned to the phase of its first symbol
    std::size_t d_count = 0; ///< symbols of the chunk, usable or not
    std::size_t d_since = 0; ///< symbols since suspicion was last weighed
    moments d_weighed;       ///< of the symbols being weighed, in units of the corrected sample
    std::array<sample, longest_chunk> d_turned{}, d_phasor{};
};

} // namespace halfplane::link
