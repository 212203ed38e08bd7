// SPDX-License-Identifier: GPL-3.0-or-later
// symbol_format: the ways in which a stream carries symbols: indices, as shorts or as bytes, labels, bits.
#pragma once

#include "halfplane/signal_set.h"

#include <cstddef>
#include <string>

namespace gr::halfplane {

enum class symbol_format { indices, byte_indices, labels, bits };

/// \throws std::invalid_argument naming block, parameter and value
symbol_format
parse_symbol_format(const std::string& block, const std::string& parameter, const std::string& text);

/// Bytes that are indices leave 255 for what is none. \throws std::invalid_argument for a set of more than
/// 255 points
void require_room(const std::string& block, symbol_format format, const ::halfplane::signal_set& set);

/// Bytes of one stream item, and items of one symbol.
std::size_t item_size(symbol_format format) noexcept;
int items_per_symbol(symbol_format format, const ::halfplane::signal_set& set) noexcept;

} // namespace gr::halfplane
