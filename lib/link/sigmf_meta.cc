// SPDX-License-Identifier: GPL-3.0-or-later
// sigmf_meta: field by field, each refusal with the file, the place and the value.
#include "sigmf_meta.h"

#include <algorithm>
#include <cctype>
#include <cerrno>
#include <cmath>
#include <cstring>
#include <fstream>
#include <stdexcept>

namespace halfplane::link {

namespace {

using nlohmann::json;

[[noreturn]] void refuse(const std::string& message)
{
    throw std::invalid_argument(message);
}

std::string shown(const json& value)
{
    auto text = value.dump(-1, ' ', true, json::error_handler_t::replace);
    return text.size() <= 80 ? text : text.substr(0, 77) + "...";
}

json parsed(const std::string& path)
{
    std::ifstream file(path);
    if (!file)
        refuse(path + ": " + std::strerror(errno));
    try {
        return json::parse(file);
    } catch (const json::exception& e) {
        const std::string text = e.what();
        const auto prefix = text.find("] ");
        refuse(path + ": not JSON: " + (prefix == std::string::npos ? text : text.substr(prefix + 2)));
    }
}

/// One object of the document, and how errors name it.
struct part {
    const json& object;
    std::string place; ///< "firn.sigmf-meta: captures[2]: "

    const json* find(const char* field) const
    {
        const auto found = object.find(field);
        return found == object.end() || found->is_null() ? nullptr : &*found;
    }

    [[noreturn]] void bad(const char* field, const std::string& wanted) const
    {
        refuse(place + field + ": " + wanted + " is wanted, got " + shown(*find(field)));
    }

    std::optional<std::uint64_t> count(const char* field) const
    {
        const auto* value = find(field);
        if (!value)
            return std::nullopt;
        if (value->is_number_unsigned())
            return value->get<std::uint64_t>();
        // Some writers put whole numbers as 4096.0.
        if (const double x = value->is_number() ? value->get<double>() : -1;
            x >= 0 && x < 0x1p53 && x == std::floor(x))
            return static_cast<std::uint64_t>(x);
        bad(field, "a whole number from 0 on");
    }

    std::optional<double> number(const char* field) const
    {
        const auto* value = find(field);
        if (!value)
            return std::nullopt;
        if (!value->is_number() || !std::isfinite(value->get<double>()))
            bad(field, "a finite number");
        return value->get<double>();
    }

    std::optional<std::string> text(const char* field) const
    {
        const auto* value = find(field);
        if (!value)
            return std::nullopt;
        if (!value->is_string())
            bad(field, "a string");
        return value->get<std::string>();
    }
};

const json& section(const json& document, const std::string& path, const char* name, bool array)
{
    static const json none = json::array();
    const auto found = document.is_object() ? document.find(name) : document.end();
    if (found == document.end()) {
        if (array)
            return none;
        refuse(path + ": field \"" + name + "\" is missing: not SigMF metadata");
    }
    if (array ? !found->is_array() : !found->is_object())
        refuse(path + ": " + name + ": " + (array ? "an array" : "an object") + " is wanted, got " +
               shown(*found));
    return *found;
}

std::string file_name(const part& global)
{
    const auto name = global.text("core:dataset").value_or("");
    if (name.find('/') != std::string::npos || name == "." || name == "..")
        global.bad("core:dataset", "the name of a file beside the metadata");
    return name;
}

std::optional<std::string> digest(const part& global)
{
    auto text = global.text("core:sha512");
    if (!text)
        return text;
    std::transform(text->begin(), text->end(), text->begin(), [](unsigned char c) {
        return static_cast<char>(std::tolower(c));
    });
    if (text->size() != 128 || text->find_first_not_of("0123456789abcdef") != std::string::npos)
        global.bad("core:sha512", "128 hexadecimal digits");
    return text;
}

sigmf_capture capture_of(const part& from, std::uint64_t offset)
{
    sigmf_capture c;
    const auto start = from.count("core:sample_start");
    if (!start)
        refuse(from.place + "core:sample_start is missing");
    if (*start < offset)
        from.bad("core:sample_start", "a number from core:offset = " + std::to_string(offset) + " on");
    c.sample_start = *start - offset;
    c.header_bytes = from.count("core:header_bytes").value_or(0);
    c.global_index = from.count("core:global_index");
    c.frequency = from.number("core:frequency");
    c.datetime = from.text("core:datetime");
    if (c.datetime) {
        c.time = parse_utc(*c.datetime);
        if (!c.time)
            from.bad("core:datetime", "a moment such as 2026-12-01T06:30:00.000Z");
    }
    return c;
}

} // namespace

sigmf_meta read_sigmf_meta(const std::string& path)
{
    const json document = parsed(path);
    const part global{section(document, path, "global", false), path + ": "};

    sigmf_meta meta;
    const auto datatype = global.text("core:datatype");
    if (!datatype)
        refuse(path + ": core:datatype is missing");
    meta.datatype = *datatype;
    if (const auto rate = global.number("core:sample_rate")) {
        if (*rate <= 0)
            global.bad("core:sample_rate", "a number of Hz above 0");
        meta.sample_rate = *rate;
    }
    if (global.count("core:num_channels").value_or(1) != 1)
        global.bad("core:num_channels", "a recording of 1 channel");
    if (const auto* flag = global.find("core:metadata_only"); flag && *flag != json(false))
        global.bad("core:metadata_only", "metadata with samples");
    meta.dataset = file_name(global);
    meta.trailing_bytes = global.count("core:trailing_bytes").value_or(0);
    meta.sha512 = digest(global);
    if (const auto* set = global.find("halfplane:set")) {
        if (!set->is_string() && !set->is_object())
            global.bad("halfplane:set", "the name of a set or the document of a set file");
        meta.set = *set;
    }
    meta.pattern = global.text("halfplane:pattern").value_or("");

    const auto offset = global.count("core:offset").value_or(0);
    const json& captures = section(document, path, "captures", true);
    for (std::size_t k = 0; k < captures.size(); ++k) {
        const part each{captures[k], path + ": captures[" + std::to_string(k) + "]: "};
        if (!captures[k].is_object())
            refuse(each.place + "an object is wanted, got " + shown(captures[k]));
        meta.captures.push_back(capture_of(each, offset));
        if (k > 0 && meta.captures[k].sample_start <= meta.captures[k - 1].sample_start)
            each.bad("core:sample_start", "a number above that of the capture before");
    }
    return meta;
}

} // namespace halfplane::link
