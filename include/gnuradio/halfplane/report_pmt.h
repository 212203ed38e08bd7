// SPDX-License-Identifier: GPL-3.0-or-later
// report_pmt: a report as a PMT dictionary and back, so that message ports and log lines carry the same
// document.
#pragma once

#include <nlohmann/json.hpp>
#include <pmt/pmt.h>

namespace gr::halfplane {

/*!
 * JSON to PMT, field for field in the same order.
 *
 * | JSON | PMT |
 * |---|---|
 * | object | dict, keys as symbols |
 * | array | vector |
 * | integer ≥ 0 | uint64 (counts stay 64-bit and unsigned) |
 * | integer < 0 | long |
 * | other number | double |
 * | string | symbol |
 * | `time`, UTC as RFC 3339 has it | tuple (uint64 seconds since 1970, double fraction), as the radio's
 * `rx_time` tags |
 *
 * The time is the one string that never repeats, and PMT keeps every symbol for good: as a symbol, each
 * report would leave one behind and slow down all later look-ups.
 *
 * \throws std::invalid_argument on null, which stands nowhere in a report
 */
pmt::pmt_t json_to_pmt(const nlohmann::ordered_json& document);

/*!
 * The way back. Fields of bytes (u8vector) and of samples (c32vector) are no part of a report and left out:
 * the log gets the state of a run to keep the one way, views get recent samples the other. A time is written
 * with three decimals, or six where three do not say all. An empty object and an absent message are the same
 * PMT (nil) and come back as an empty object. \throws std::invalid_argument on what the table above does not
 * hold (uniform vectors of numbers become arrays)
 */
nlohmann::ordered_json pmt_to_json(const pmt::pmt_t& message);

} // namespace gr::halfplane
