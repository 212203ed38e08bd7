// SPDX-License-Identifier: GPL-3.0-or-later
// tolerance: the range of the tolerance that geometric facts take.
#pragma once

#include "refusal.h"

#include <stdexcept>

namespace halfplane::detail {

/// \throws std::invalid_argument unless 0 ≤ tolerance < 0.25 (beyond, two points could pass for one)
inline void require_tolerance(double tolerance)
{
    if (!(tolerance >= 0 && tolerance < 0.25))
        refuse<std::invalid_argument>("tolerance must lie in 0 … 0.25 (below), got ", tolerance);
}

} // namespace halfplane::detail
