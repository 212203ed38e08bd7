// SPDX-License-Identifier: GPL-3.0-or-later
// number_text: numbers to and from text, whatever the locale.
#pragma once

#include <charconv>
#include <limits>
#include <string>
#include <string_view>

namespace halfplane::detail {

/// The decimal number that fills `text` completely, a leading + allowed; NaN where it is none or does not fit
/// a double.
inline double parse_number(std::string_view text)
{
    if (text.size() > 1 && text[0] == '+' && text[1] != '-')
        text.remove_prefix(1);
    double value = 0;
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
    return error == std::errc{} && end == text.data() + text.size()
               ? value
               : std::numeric_limits<double>::quiet_NaN();
}

/// The shortest decimal text that reads back as the same double.
inline std::string shortest(double value)
{
    char text[32];
    return {text, std::to_chars(text, text + sizeof text, value).ptr};
}

} // namespace halfplane::detail
