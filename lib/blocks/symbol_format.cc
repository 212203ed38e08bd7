// SPDX-License-Identifier: GPL-3.0-or-later
// symbol_format: the three ways in which a stream carries symbols: indices, labels, bits.
#include "symbol_format.h"

#include <cstdint>
#include <stdexcept>

namespace gr::halfplane {

symbol_format
parse_symbol_format(const std::string& block, const std::string& parameter, const std::string& text)
{
    if (text == "indices")
        return symbol_format::indices;
    if (text == "labels")
        return symbol_format::labels;
    if (text == "bits")
        return symbol_format::bits;
    throw std::invalid_argument(block + ": " + parameter + " is '" + text +
                                "'; one of indices, labels, bits is wanted");
}

std::size_t item_size(symbol_format format) noexcept
{
    return format == symbol_format::bits ? sizeof(std::uint8_t) : sizeof(std::int16_t);
}

int items_per_symbol(symbol_format format, const ::halfplane::signal_set& set) noexcept
{
    return format == symbol_format::bits ? static_cast<int>(set.label_bits()) : 1;
}

} // namespace gr::halfplane
