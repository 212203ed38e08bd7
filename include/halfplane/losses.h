// SPDX-License-Identifier: GPL-3.0-or-later
// losses: which cause costs how many dB.
#pragma once

#include "halfplane/rates.h"
#include "halfplane/residuals.h"
#include "halfplane/ser_curve.h"

#include <cstdint>
#include <optional>
#include <vector>

namespace halfplane {

enum class cause {
    gain_error,     ///< points stand at another size than the detector expects
    phase_error,    ///< and turned
    offset,         ///< a constant (carrier leakage)
    iq_imbalance,   ///< the mirror image of the symbol itself
    compression,    ///< gain or phase that changes with the symbol's power
    echo,           ///< single neighbours of any phase
    timing,         ///< neighbours as a late or early sampling instant mixes them in
    filter,         ///< other neighbours: filters that do not match
    phase_noise,    ///< rotation that changes from symbol to symbol
    coloured_noise, ///< the part of the noise that the noise one symbol before foretells
    excess_noise,   ///< white noise beyond what the input's Es/N0 explains
    interaction,    ///< what the causes cost together beyond the sum of each (mostly negative)
    unexplained,    ///< what was counted beyond what all of them explain
};
const char* to_string(cause c) noexcept;

struct loss {
    cause what;
    std::optional<double> power_db; ///< relative to the signal's power received; absent for the last two
    double cost_db;                 ///< see find_losses()
};

struct loss_question {
    /// Es/N0 ahead of the receiver, dB; absent where it is not known.
    std::optional<double> input_es_n0_db;
    /// N0 over Es by the gauge of all judged symbols; absent: by the regression, from the explained ones
    /// alone.
    std::optional<double> gauged_n0;
    /// The Es/N0 at which the exact curve gives the counted SER, dB; absent without errors.
    std::optional<double> achieved_es_n0_db;
};

/// A cause is listed where chance alone would show it once in 1e4 runs.
constexpr double loss_significance = 1e-4;

/*!
 * Causes, each with its power and its cost: by how many dB the Es/N0 at which the exact curve gives the SER
 * would rise if this cause alone were mended, all others staying. So the costs are what the user gains by
 * repairing one thing; they do not add up to the whole, since a second cause hurts more where a first one has
 * used the room. The difference is the row `interaction`; with it and `unexplained` the rows add up to the
 * shortfall at the input (with the input known) or to the distance between the noise alone and what was
 * counted (without; `excess_noise` is not listed then).
 *
 * SER by the exact rate of displaced means, averaged over neighbours and phase (not as noise of the same
 * power: what is bounded hurts less).
 *
 * Compression, phase noise, timing and filters also take part of the signal's gain. Where the gain seen is
 * off 1 by that, mending the cause mends the gain; where a gain control has made up for it, mending lets the
 * control turn back, and the noise shrinks with it. Between the two, the gain left over is the one nearest
 * to 1.
 *
 * Only causes beyond chance are listed. Nothing where fit_residuals() gives nothing or where moments are
 * missing.
 */
std::vector<loss> find_losses(const predictor& p,
                              const ser_curve& curve,
                              const residual_sums& sums,
                              const loss_question& asked);

/// Es/N0 in dB at which the curve gives this SER; the nearer end where it nowhere does.
double es_n0_db_of(const ser_curve& curve, double ln_ser, double guess_db);

} // namespace halfplane
