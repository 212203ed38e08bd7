// SPDX-License-Identifier: GPL-3.0-or-later
// span_pmt: spans of known symbols as they come in tags and messages.
#pragma once

#include "halfplane/link/known_spans.h"

#include <pmt/pmt.h>

#include <cstddef>
#include <cstdint>

namespace gr::halfplane {

/// Value of a tag at `symbol`: a vector of integers, or {indices: such a vector, decoded: bool}. `points`: of
/// the set. \throws std::invalid_argument naming the field, or place and value of the index, that is wrong
::halfplane::link::known_span
span_from_tag(std::uint64_t symbol, const pmt::pmt_t& value, std::size_t points);

/// A pair of {first_symbol, decoded} and a vector of integers; `decoded` may be missing. \throws as above
::halfplane::link::known_span span_from_pdu(const pmt::pmt_t& message, std::size_t points);

} // namespace gr::halfplane
