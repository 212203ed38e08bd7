// SPDX-License-Identifier: GPL-3.0-or-later
// symbol_format: the ways in which a stream carries symbols: indices, as shorts or as bytes, labels, bits.
#include "symbol_format.h"

#include <cstdint>
#include <stdexcept>

namespace gr::halfplane {

symbol_format
parse_symbol_format(const std::string& block, const std::string& parameter, const std::string& text)
{
    if (text == "indices")
        return symbol_format::indices;
    if (text == "byte_indices")
        return symbol_format::byte_indices;
    if (text == "labels")
        return symbol_format::labels;
    if (text == "bits")
        return symbol_format::bits;
    throw std::invalid_argument(block + ": " + parameter + " is '" + text +
                                "'; one of indices, byte_indices, labels, bits is wanted");
}

std::size_t item_size(symbol_format format) noexcept
{
    const bool bytes = format == symbol_format::bits || format == symbol_format::byte_indices;
    return bytes ? sizeof(std::uint8_t) : sizeof(std::int16_t);
}

void require_room(const std::string& block, symbol_format format, const ::halfplane::signal_set& set)
{
    constexpr std::size_t most = 255;
    if (format == symbol_format::byte_indices && set.size() > most)
        throw std::invalid_argument(block + ": byte_indices hold sets of up to " + std::to_string(most) +
                                    " points, this one has " + std::to_string(set.size()));
}

int items_per_symbol(symbol_format format, const ::halfplane::signal_set& set) noexcept
{
    return format == symbol_format::bits ? static_cast<int>(set.label_bits()) : 1;
}

} // namespace gr::halfplane
