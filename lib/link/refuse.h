// SPDX-License-Identifier: GPL-3.0-or-later
// refuse: an error made of pieces of text and numbers.
#pragma once

#include <sstream>
#include <stdexcept>

namespace halfplane::link {

/// \throws std::invalid_argument, always; numbers with ten digits
template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    std::ostringstream text;
    text.precision(10);
    (text << ... << parts);
    throw std::invalid_argument(text.str());
}

} // namespace halfplane::link
