// SPDX-License-Identifier: GPL-3.0-or-later
// refusal: one way to say what is refused and why, for every source file of the core.
#pragma once

#include <sstream>
#include <string>

namespace halfplane::detail {

/// The parts one after the other, numbers with ten significant digits.
template <typename... Parts>
std::string text_of(const Parts&... parts)
{
    std::ostringstream text;
    text.precision(10);
    (text << ... << parts);
    return text.str();
}

/// Throws an Error whose message is text_of(parts…).
template <typename Error, typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    throw Error(text_of(parts...));
}

} // namespace halfplane::detail
