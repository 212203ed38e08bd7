// SPDX-License-Identifier: GPL-3.0-or-later
// align_split: between which symbols one alignment ended and another began.
#pragma once

#include "align_types.h"

namespace halfplane::link {

/*!
 * Both walk the log-likelihood ratios of symbols begin … end − 1 that the alignment holds against no
 * alignment at all
 * (`fitted`: samples corrected to the scale of the set; `coefficient`: their usual correlation with the
 * pattern), and leave to the gap what lies within odds of e^5 to one of the likeliest split.
 */

/// First symbol from which `old` no longer holds, with the doubtful ones counted to the gap.
std::uint64_t last_of_old(reference& ref,
                          const ring<sample>& fitted,
                          const alignment& old,
                          double coefficient,
                          std::uint64_t begin,
                          std::uint64_t end);

/// One past the last symbol at which `next` does not yet hold for certain.
std::uint64_t first_of_new(reference& ref,
                           const ring<sample>& fitted,
                           const alignment& next,
                           double coefficient,
                           std::uint64_t begin,
                           std::uint64_t end);

} // namespace halfplane::link
