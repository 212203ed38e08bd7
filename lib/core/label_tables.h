// SPDX-License-Identifier: GPL-3.0-or-later
// label_tables: labels that were searched for, for families without a Gray labelling.
#pragma once

#include "halfplane/signal_set.h"

#include <vector>

namespace halfplane::detail {

/// Labels of cross:size by index; size = 32, 128, 512, 2048.
std::vector<label_t> cross_labels(std::size_t size);

} // namespace halfplane::detail
