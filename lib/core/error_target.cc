// SPDX-License-Identifier: GPL-3.0-or-later
// error_target: read from text.
#include "halfplane/error_target.h"

#include "refusal.h"

#include <cstdlib>
#include <stdexcept>

namespace halfplane {

const char* to_string(error_kind kind) noexcept
{
    switch (kind) {
    case error_kind::ser:
        return "ser";
    case error_kind::ber:
        return "ber";
    case error_kind::fer:
        break;
    }
    return "fer";
}

error_target parse_error_target(const std::string& text)
{
    const auto colon = text.find(':');
    const auto word = text.substr(0, colon);
    for (auto kind : {error_kind::ser, error_kind::ber, error_kind::fer}) {
        if (word != to_string(kind))
            continue;
        const std::string number = colon == std::string::npos ? "" : text.substr(colon + 1);
        char* end = nullptr;
        const double rate = std::strtod(number.c_str(), &end);
        if (number.empty() || *end != '\0' || !(rate > 0 && rate < 1))
            detail::refuse<std::invalid_argument>(
                "target is '", text, "'; a rate between 0 and 1 is wanted behind ", word, ":");
        return {kind, rate};
    }
    detail::refuse<std::invalid_argument>("target is '", text, "'; ser:RATE, ber:RATE or fer:RATE is wanted");
}

} // namespace halfplane
