// SPDX-License-Identifier: GPL-3.0-or-later
// information_grid: differential entropies of a Gaussian mixture and of its halves by bit, on a grid of
// places.
#pragma once

#include "halfplane/signal_set.h"

#include <vector>

namespace halfplane::detail {

/// h(Y) and h(Y, B_k) for every bit, in bits.
struct mixture_entropies {
    double all = 0;
    std::vector<double> by_bit;
};

/*!
 * The mixture Σ p_i · exp(−|y − z_i|²)/π on the plane, or Σ p_i · exp(−(y − z_i)²)/√π on the line.
 *
 * −∫ p·log2 p by the trapezoid rule with steps of 1/10. For entire functions that rule errs by
 * exp(−2π·δ/step), δ the distance of the nearest singularity from the real axis (Trefethen and Weideman, SIAM
 * Review 56 (2014) 385). log p is singular where p vanishes: between two points a distance D apart at
 * δ = π/(2D), but there p itself is below exp(−D²/4). The worst D leaves exp(−¾·(2π²/step)^⅔) = 1e-11.
 * Grids are shifted off the points by `shift` steps, which must not matter.
 */
mixture_entropies plane_entropies(const std::vector<complex>& points,
                                  const std::vector<double>& priors,
                                  const std::vector<label_t>& labels,
                                  unsigned label_bits,
                                  double shift = 0.3);
mixture_entropies line_entropies(const std::vector<double>& points,
                                 const std::vector<double>& priors,
                                 const std::vector<label_t>& labels,
                                 unsigned label_bits,
                                 double shift = 0.3);

} // namespace halfplane::detail
