// SPDX-License-Identifier: GPL-3.0-or-later
// utc: a moment as RFC 3339 writes it.
#pragma once

#include <cstdint>
#include <optional>
#include <string>

namespace halfplane::link {

/// A moment of UTC, and how finely it was written down. Leap seconds are not counted.
struct utc_moment {
    std::int64_t seconds; ///< since 1970-01-01T00:00:00Z
    double fraction;      ///< of a second, 0 ≤ fraction < 1
    double resolution;    ///< seconds: 1 for whole seconds, 1e-3 for three decimals …
};

/// 2026-12-01T06:30:00Z with any number of decimals; another offset than Z is taken off. Nothing where it is
/// no such moment.
std::optional<utc_moment> parse_utc(const std::string& text);

/// The moment `later` seconds after, to the millisecond below.
std::string utc_text(const utc_moment& from, double later);

} // namespace halfplane::link
