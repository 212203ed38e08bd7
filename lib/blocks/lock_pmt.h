// SPDX-License-Identifier: GPL-3.0-or-later
// lock_pmt: the status of a lock as a PMT dict and back.
#pragma once

#include "halfplane/link/aligner.h"

#include <pmt/pmt.h>

namespace gr::halfplane {

/// {state, delay, rotation_deg, mirrored, inverted, frequency, slips}
pmt::pmt_t lock_to_pmt(const ::halfplane::link::lock_status& status);
/// \throws std::invalid_argument naming the field that is missing or of another kind
::halfplane::link::lock_status lock_from_pmt(const pmt::pmt_t& message);

/// Tag keys that aligner writes and link_watch reads.
const pmt::pmt_t& lock_key();
const pmt::pmt_t& pending_key();

} // namespace gr::halfplane
