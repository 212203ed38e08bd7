// SPDX-License-Identifier: GPL-3.0-or-later
// carry_file: read and compared.
#include "carry_file.h"

#include "halfplane/link/log.h"

#include <cerrno>
#include <fstream>
#include <stdexcept>
#include <system_error>

namespace halfplane::link {

std::optional<nlohmann::json> read_carry(const std::string& log)
{
    if (log.empty())
        return std::nullopt;
    const auto path = report_log::carry_path(log);
    std::ifstream file(path);
    if (!file) {
        const auto why = std::generic_category().message(errno);
        if (!std::ifstream(log))
            return std::nullopt;
        throw std::invalid_argument("resume: " + path + " cannot be read: " + why);
    }
    auto document = nlohmann::json::parse(file, nullptr, false);
    if (!document.is_object() || document.value("schema", nlohmann::json()) != "halfplane/carry/1" ||
        !document.contains("settings") || !document["settings"].is_object() || !document.contains("sums"))
        throw std::invalid_argument("resume: " + path + " is not the state of a run (halfplane/carry/1)");
    return document;
}

void refuse_other_settings(const nlohmann::json& then, const nlohmann::json& now)
{
    const auto value = [](const nlohmann::json& from, const std::string& field) {
        return from.contains(field) ? from[field].dump() : std::string("absent");
    };
    const auto refuse = [](const std::string& field, const std::string& was, const std::string& is) {
        throw std::invalid_argument("resume: " + field + " was " + was + " in the earlier run, is " + is);
    };
    auto fields = now;
    fields.update(then);
    for (const auto& [field, any] : fields.items()) {
        if (then.contains(field) && now.contains(field) && then[field] == now[field])
            continue;
        if (any.is_array() && then.contains(field) && now.contains(field) &&
            now[field].size() == then[field].size()) {
            for (std::size_t k = 0; k < any.size(); ++k)
                if (then[field][k] != now[field][k])
                    refuse(
                        field + "[" + std::to_string(k) + "]", then[field][k].dump(), now[field][k].dump());
        } else if (any.is_array() && then.contains(field) && now.contains(field)) {
            refuse("the number of " + field,
                   std::to_string(then[field].size()),
                   std::to_string(now[field].size()));
        }
        refuse(field, value(then, field), value(now, field));
    }
}

} // namespace halfplane::link
