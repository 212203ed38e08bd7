// SPDX-License-Identifier: GPL-3.0-or-later
// pattern_file: a user's own pattern, bits or indices, read from text.
#pragma once

#include "halfplane/signal_set.h"

#include <cstdint>
#include <string>
#include <vector>

namespace halfplane {

struct pattern_file {
    std::vector<std::uint16_t> indices; ///< one period
    bool bits = false;                  ///< written as bits
};

/// \throws std::invalid_argument naming file, line and value
pattern_file read_pattern_file(const std::string& path, const signal_set& set);

} // namespace halfplane
