// SPDX-License-Identifier: GPL-3.0-or-later
// set_json: set files in JSON.
#include "halfplane/set_file.h"

#include "number_text.h"
#include "refusal.h"
#include "set_builder.h"

#include <nlohmann/json.hpp>

#include <istream>
#include <ostream>
#include <set>

namespace halfplane {

namespace {

using detail::quoted;
using detail::refuse;
using nlohmann::json;

std::string shown(const json& value)
{
    return detail::one_line(value.dump(-1, ' ', false, json::error_handler_t::replace));
}

/// The library's text from "parse error at line …" or the cause on, without its own prefix.
std::string reason(const json::exception& e)
{
    const std::string text = e.what();
    const auto end_of_prefix = text.find("] ");
    return end_of_prefix == std::string::npos ? text : text.substr(end_of_prefix + 2);
}

/*!
 * Parses and refuses what the library would let pass: a field given twice (the last one would win) and
 * nesting deeper than a set file has.
 */
json parse(std::istream& in, const std::string& source)
{
    constexpr int deepest = 3;
    std::vector<std::set<std::string>> fields;
    const auto watch = [&](int depth, json::parse_event_t event, json& value) {
        if (event == json::parse_event_t::object_start || event == json::parse_event_t::array_start) {
            if (depth >= deepest)
                refuse<invalid_set>(source, ": nested deeper than a set file is");
            fields.emplace_back();
        } else if (event == json::parse_event_t::object_end || event == json::parse_event_t::array_end) {
            fields.pop_back();
        } else if (event == json::parse_event_t::key &&
                   !fields.back().insert(value.get<std::string>()).second) {
            refuse<invalid_set>(source, ": field ", shown(value), " is given twice in one object");
        }
        return true;
    };
    try {
        return json::parse(in, watch);
    } catch (const json::exception& e) {
        refuse<invalid_set>(source, ": not JSON: ", reason(e));
    }
}

void require_known_fields(const json& object,
                          const std::string& place,
                          const std::set<std::string>& known,
                          const char* list)
{
    for (const auto& [field, value] : object.items())
        if (!known.count(field))
            refuse<invalid_set>(
                place, "unknown field ", quoted(field), ": ", shown(value), "; known are ", list);
}

std::string text_field(const json& document, const char* field, const std::string& source)
{
    const auto found = document.find(field);
    if (found == document.end())
        return {};
    if (!found->is_string())
        refuse<invalid_set>(source, ": field \"", field, "\": must be a string, got ", shown(*found));
    return found->get<std::string>();
}

double number_field(const json& point, const char* field, const std::string& place)
{
    const auto found = point.find(field);
    if (found == point.end())
        refuse<invalid_set>(place, "field \"", field, "\" is missing");
    if (!found->is_number())
        refuse<invalid_set>(place, "field \"", field, "\": must be a number, got ", shown(*found));
    return found->get<double>();
}

} // namespace

signal_set read_set_json(std::istream& in, const std::string& source)
{
    const json document = parse(in, source);
    if (!document.is_object())
        refuse<invalid_set>(source, ": must be a JSON object with \"points\", got ", shown(document));
    require_known_fields(document, source + ": ", {"name", "note", "points"}, "name, note, points");
    auto name = text_field(document, "name", source), note = text_field(document, "note", source);

    const auto points = document.find("points");
    if (points == document.end())
        refuse<invalid_set>(source, ": field \"points\" is missing");
    if (!points->is_array())
        refuse<invalid_set>(source, ": field \"points\": must be an array, got ", shown(*points));

    detail::set_builder builder(source);
    for (std::size_t k = 0; k < points->size(); ++k) {
        const json& point = (*points)[k];
        const std::string where = "point " + std::to_string(k), place = source + ": " + where + ": ";
        if (!point.is_object())
            refuse<invalid_set>(place, "must be an object with label, i, q, got ", shown(point));
        require_known_fields(point, place, {"label", "i", "q", "p"}, "label, i, q, p");
        const auto label = point.find("label");
        if (label == point.end())
            refuse<invalid_set>(place, "field \"label\" is missing");
        if (!label->is_string())
            refuse<invalid_set>(place, "field \"label\": must be a string, got ", shown(*label));
        std::optional<double> prior;
        if (point.contains("p"))
            prior = number_field(point, "p", place);
        builder.add(where,
                    label->get<std::string>(),
                    number_field(point, "i", place),
                    number_field(point, "q", place),
                    prior);
    }
    return builder.finish(std::move(name), std::move(note));
}

void write_set_json(std::ostream& out, const signal_set& set)
{
    const auto text = [](const std::string& s) {
        return json(s).dump(-1, ' ', false, json::error_handler_t::replace);
    };
    out << "{\"name\": " << text(set.name());
    if (!set.note().empty())
        out << ",\n \"note\": " << text(set.note());
    out << ",\n \"points\": [";
    for (std::size_t k = 0; k < set.size(); ++k) {
        out << (k ? ",\n" : "\n") << "  {\"label\": \"" << set.label_string(k)
            << "\", \"i\": " << detail::shortest(set.points()[k].real())
            << ", \"q\": " << detail::shortest(set.points()[k].imag());
        if (!set.uniform())
            out << ", \"p\": " << detail::shortest(set.priors()[k]);
        out << '}';
    }
    out << "\n]}\n";
}

} // namespace halfplane
