// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge: Es/N0 ahead of the receiver, from raw samples.
#pragma once

#include <complex>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>

namespace halfplane::link {

/// Hz relative to the centre of the samples' spectrum, low < high, within ± half the sample rate.
struct frequency_band {
    double low, high;
    double width() const { return high - low; }
};

struct input_gauge_options {
    double sample_rate; ///< Hz, > 0
    double symbol_rate; ///< Hz, > 0, at most the sample rate
    /// Where the signal is, all of it: at least symbol_rate wide. Roll-off β needs symbol_rate·(1 + β).
    frequency_band band;
    /// Noise and nothing else, of the density that it has within the band; clear of `band`, of the sidelobes
    /// of the transmitter, and of the slopes of filters. None: a stretch with the transmitter off is used.
    std::optional<frequency_band> noise_band;
    /// Samples from one segment to the next; 0: half a segment. More takes less time and gives a wider error.
    std::size_t hop = 0;
};

struct input_reading {
    double es_n0_db;
    double es_n0_db_se;   ///< standard error, dB, from the scatter of what was averaged
    double signal_power;  ///< within the band, less the noise; in the square of the samples' unit
    double noise_density; ///< the same unit per Hz
    std::uint64_t segments, quiet_segments; ///< averaged, with the transmitter on and off
};

/*!
 * Averaged periodograms (Welch 1967, IEEE Trans. Audio Electroacoust. AU-15), under the four-term window of
 * Harris (1978, Proc. IEEE 66, no. 1, −92 dB; coefficients from memory) so that a strong signal does not
 * leak into the noise. With N0 the density of noise and P the power above it within the band,
 *
 *     Es/N0 = P / (symbol_rate · N0),
 *
 * which is what a filter matched to the pulse delivers at its output. Taken from a quiet stretch, N0 is
 * averaged with the weight of the signal's own spectrum, as a matched filter would.
 *
 * Within 0.1 dB from 0 to 30 dB where the noise band is clean. A constant offset within the band counts as
 * signal: take it away first, or tune beside it. The standard error is that of the averages, by the scatter
 * of 32 to 64 consecutive batches of segments; what is the same in all of them, a noise band that is not
 * clean, it cannot show.
 *
 * Segments of 256 to 65,536 samples, by the bands' widths. A segment with a sample that is not finite is
 * left out.
 */
class input_gauge
{
public:
    static constexpr std::uint64_t least_segments = 64;

    /// \throws std::invalid_argument naming the parameter, its value and what is wanted
    explicit input_gauge(const input_gauge_options& options);
    ~input_gauge();
    input_gauge(input_gauge&&) noexcept;

    /// \param transmitter_on false for a quiet stretch; a change gives up the segment under way
    void add(const std::complex<float>* in, std::size_t n, bool transmitter_on = true);
    /// Samples are missing here: the segment under way is given up.
    void gap();
    /// Nothing before `least_segments` of each kind that is needed, or where the power above the noise is
    /// below twice its own standard error.
    std::optional<input_reading> read() const;
    /// Forgets what was taken with the transmitter on; the quiet stretch stays known.
    void restart();
    /// Forgets the quiet stretch.
    void restart_quiet();

    std::size_t segment() const noexcept; ///< samples
    std::uint64_t nonfinite() const noexcept;

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::link
