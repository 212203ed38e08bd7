// SPDX-License-Identifier: GPL-3.0-or-later
// sigmf_meta: what a .sigmf-meta file says, checked field by field.
#pragma once

#include "utc.h"

#include <nlohmann/json.hpp>

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

namespace halfplane::link {

struct sigmf_capture {
    std::uint64_t sample_start = 0; ///< in the data file, core:offset taken off
    std::uint64_t header_bytes = 0; ///< that stand before its first sample
    std::optional<std::uint64_t> global_index;
    std::optional<double> frequency;
    std::optional<std::string> datetime;
    std::optional<utc_moment> time;
};

struct sigmf_meta {
    std::string datatype;
    double sample_rate = 0; ///< Hz; 0 where not said
    std::string dataset;    ///< file name of the data; empty where not said
    std::uint64_t trailing_bytes = 0;
    std::optional<std::string> sha512; ///< lower case
    nlohmann::json set;                ///< halfplane:set
    std::string pattern;               ///< halfplane:pattern
    std::vector<sigmf_capture> captures;
};

/// \throws std::invalid_argument naming file, and line or field and value
sigmf_meta read_sigmf_meta(const std::string& path);

} // namespace halfplane::link
