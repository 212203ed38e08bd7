// SPDX-License-Identifier: GPL-3.0-or-later
// simulate: counts the errors of seeded random links on all cores; the same seed gives the same counts on one
// core or many.
#pragma once

#include "halfplane/law.h"
#include "halfplane/rates.h"
#include "halfplane/signal_set.h"
#include "halfplane/tally.h"

#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace halfplane {

/*!
 * A memoryless disturbance that moves the points away from where the detector expects them. Applied in this
 * order: compression, imbalance, rotation, offset.
 */
struct displacement {
    double rotation = 0;          ///< radians, counter-clockwise
    double gain_imbalance_db = 0; ///< in-phase over quadrature amplitude, 20·log10, shared equally by both
    double phase_imbalance = 0;   ///< radians by which the two axes miss the right angle, shared equally
    complex offset = 0;           ///< in the points' unit
    double saturation = 0;        ///< amplitude that the compressing amplifier approaches; 0: no compression
    double compression_smoothness =
        2; ///< p of Rapp, GLOBECOM 1991: |out| = |in| / (1 + (|in|/saturation)^2p)^(1/2p)

    /// Where each point of the set is received. \throws std::invalid_argument where a field is out of its
    /// range
    std::vector<complex> means(const signal_set& set) const;
};

struct simulation_options {
    double es_n0 = 10; ///< linear, > 0, finite; Es by the set's points and priors
    std::shared_ptr<const law> channel = std::make_shared<awgn>();
    detector rule = detector::automatic;
    std::vector<complex> means;        ///< where each point is received without noise; empty: at the points
    std::uint64_t wanted_errors = 200; ///< stop at as many symbol errors; 0: never
    std::uint64_t max_symbols = 1000000000; ///< > 0
    double relative_width = 0; ///< stop when (high − low)/SER of the 95 % interval is below; 0: never
    std::uint64_t seed = 1;    ///< two runs of one seed draw the same noise, at another Es/N0 too
    unsigned threads = 0;      ///< 0: as many as the machine has cores
};

struct simulation_progress {
    const tally& counts;
    double seconds;
    double fraction; ///< of the work, by whichever limit is nearest, 0 … 1
};
/// Called on the thread that called simulate(), ten times a second at most. Return false to stop there.
using progress_callback = std::function<bool(const simulation_progress&)>;

struct simulation {
    tally counts;
    double seconds;
    bool cancelled; ///< the callback said so; what was counted stands
    double symbols_per_second() const
    {
        return seconds > 0 ? static_cast<double>(counts.symbols) / seconds : 0;
    }
};

/*!
 * Draws points by prior (resolution 2^-32), moves them to their means, adds noise under the law, decides and
 * tallies. The detector knows gain and noise density. Runs of 65,536 symbols are the unit of work and of the
 * stopping rules, so that the counts depend on seed and options alone. \throws std::invalid_argument naming
 * the option, its value and what is wrong
 */
simulation
simulate(const signal_set& set, const simulation_options& options, const progress_callback& progress = {});

/// A rate from importance sampling, with its standard error.
struct rare_rate {
    double value, standard_error;
};

struct rare_simulation {
    rare_rate ser, ber;
    std::uint64_t symbols; ///< drawn for the estimate; the pilot run that set this number is not counted
    double seconds;
    bool cancelled;
};

/// Seconds since the start and the fraction of the work that is done; called as progress_callback is.
using rare_progress_callback = std::function<bool(double seconds, double fraction)>;

/*!
 * Error rates far below what plain counting reaches. Noise is drawn from a mixture of Gaussians shifted to
 * the nearest point of each edge of the sent point's cell, and of the unshifted one; every error counts with
 * the ratio of the true density to the mixture's (the balance heuristic of Veach and Guibas, SIGGRAPH 1995;
 * the unshifted part bounds the weights: Hesterberg, Technometrics 37 (1995) 185). Unbiased at every rate:
 * the mixture covers the plane and the number of draws is fixed by a pilot run whose draws are then left out.
 * \param relative_error wanted standard error of the SER over the SER, in (0, 1)
 * Of the options, wanted_errors and relative_width do not apply; max_symbols does, and leaves the standard
 * error larger. \throws std::invalid_argument as simulate(); for rates below about 1e-280; for laws whose
 * gain varies continuously too: rates fall slowly there and plain counting reaches them
 */
rare_simulation simulate_rare(const signal_set& set,
                              const simulation_options& options,
                              double relative_error = 0.05,
                              const rare_progress_callback& progress = {});

} // namespace halfplane
