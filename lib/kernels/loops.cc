// SPDX-License-Identifier: GPL-3.0-or-later
// Compiled once for each target, with HALFPLANE_TARGET its name. No library code may be instantiated here: an
// inline function of the standard library compiled for a newer processor could be the copy that the linker
// keeps for all.
#include "loops.h"

#include "count_loop.h"
#include "detect_loop.h"
#include "llr_loop.h"
#include "noise_loop.h"

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

extern const loop_table table;
const loop_table table = {HALFPLANE_TARGET_NAME,
                          decide,
                          noise,
                          random_words,
                          find_errors,
                          count_label_errors_16,
                          count_label_errors_8,
                          llr};

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
