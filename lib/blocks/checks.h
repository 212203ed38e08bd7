// SPDX-License-Identifier: GPL-3.0-or-later
// checks: refusals at construction that name block, parameter and value.
#pragma once

#include <sstream>
#include <stdexcept>
#include <string>

namespace gr::halfplane {

/// `value` where `good`, else std::invalid_argument "block: parameter is value; wanted".
template <typename T>
T checked(const char* block, const char* parameter, T value, bool good, const char* wanted)
{
    if (good)
        return value;
    std::ostringstream text;
    text << block << ": " << parameter << " is " << value << "; " << wanted;
    throw std::invalid_argument(text.str());
}

/// The same for a choice among words, which are quoted.
[[noreturn]] inline void
refuse_word(const char* block, const char* parameter, const std::string& value, const char* wanted)
{
    throw std::invalid_argument(std::string(block) + ": " + parameter + " is '" + value + "'; " + wanted);
}

} // namespace gr::halfplane
