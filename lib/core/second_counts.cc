// SPDX-License-Identifier: GPL-3.0-or-later
// second_counts: the ten-second rule, with hindsight.
#include "halfplane/second_counts.h"

namespace halfplane {

void second_counts::add(const second& s)
{
    if (s.unmeasured) {
        ++d_unmeasured;
        return;
    }

    const bool severe = s.lost || (s.bits > 0 && s.bit_errors * severe_share >= s.bits);
    const bool errored = severe || s.bit_errors > 0 || s.damaged;

    if (severe == d_is_available) { // speaks for the other state
        ++d_turning;
        d_turning_errored += errored;
    } else {
        d_turning = d_turning_errored = 0;
    }
    if (d_is_available) {
        ++d_available;
        d_errored += errored;
        d_severe += severe;
    } else {
        ++d_unavailable;
    }
    if (d_turning < row)
        return;

    if (d_is_available) { // all ten were severe, and are taken back
        d_available -= row;
        d_errored -= row;
        d_severe -= row;
        d_unavailable += row;
    } else {
        d_unavailable -= row;
        d_available += row;
        d_errored += d_turning_errored;
    }
    d_is_available = !d_is_available;
    d_turning = d_turning_errored = 0;
}

} // namespace halfplane
