// SPDX-License-Identifier: GPL-3.0-or-later
// error_target: what a link is to keep, as the user writes it: "ser:1e-3", "ber:1e-5", "fer:1e-2".
#pragma once

#include <string>

namespace halfplane {

enum class error_kind { ser, ber, fer }; ///< symbols, bits, frames
const char* to_string(error_kind kind) noexcept;

struct error_target {
    error_kind kind;
    double rate; ///< inside (0, 1)
};

/// "KIND:RATE". \throws std::invalid_argument with the text and what is wrong with it
error_target parse_error_target(const std::string& text);

} // namespace halfplane
