// SPDX-License-Identifier: GPL-3.0-or-later
// align_blind: gain, phase and frequency from samples whose symbols nobody knows yet.
#pragma once

#include "align_types.h"

#include <vector>

namespace halfplane::link {

/*!
 * Maximum likelihood over the mixture of all points, in two steps. The radius of a sample does not depend on
 * phase or frequency: its histogram gives Es/N0, and power then the gain. With these the log-likelihood of a
 * sample, as a function of its angle, is a Fourier series over the set's rotation symmetry; summed over
 * samples against a grid of phases and frequencies it becomes a handful of Fourier sums.
 *
 * Phase is found up to the set's own rotations. Where noise blurs the angle the best of the grid may be
 * wrong, so several candidates are returned for a stronger test to choose from.
 */
class blind_phase
{
public:
    struct candidate {
        complex gain;     ///< r_k = gain·s·e^{2πj·frequency·k}, k from the first sample given
        double frequency; ///< cycles a symbol, within ±1.2e-4
    };

    explicit blind_phase(const signal_set& set);
    unsigned rotations() const noexcept { return d_rotations; }

    /// Best first, at most `most`; empty where there is no power. Unusable samples count as absent.
    std::vector<candidate> estimate(const sample* r, std::size_t count, std::size_t most);

private:
    struct level {
        double snr;                     ///< Es/N0, linear
        std::vector<double> log_radius; ///< log-density of the radius, by bin
        std::vector<std::vector<sample>>
            harmonic; ///< Fourier coefficients of the log-likelihood, by harmonic and bin
    };
    void fill_harmonics(level& l) const;

    const signal_set* d_set;
    unsigned d_rotations, d_harmonics;
    double d_bins_per_rms;
    std::vector<level> d_levels;
};

} // namespace halfplane::link
