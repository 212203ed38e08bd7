// SPDX-License-Identifier: GPL-3.0-or-later
// carry_file: what an earlier run left beside its log, and whether it was of the same settings.
#pragma once

#include <nlohmann/json.hpp>

#include <optional>
#include <string>

namespace halfplane::link {

/// The file beside the log at `log`. Nothing where `log` is empty or there is neither a log nor such a file.
/// \throws std::invalid_argument where it cannot be read or is no such document
std::optional<nlohmann::json> read_carry(const std::string& log);

/// \throws std::invalid_argument naming the first field that differs, what it was and what it is
void refuse_other_settings(const nlohmann::json& then, const nlohmann::json& now);

} // namespace halfplane::link
