// SPDX-License-Identifier: GPL-3.0-or-later
// lock_state: the words that reports and messages use for the state of lock.
#include "halfplane/link/aligner.h"

namespace halfplane::link {

const char* to_string(lock_state s) noexcept
{
    switch (s) {
    case lock_state::searching:
        return "searching";
    case lock_state::held:
        return "held";
    case lock_state::doubtful:
        return "doubtful";
    case lock_state::lost:
        return "lost";
    }
    return "unknown";
}

} // namespace halfplane::link
