// SPDX-License-Identifier: GPL-3.0-or-later
// report_pmt: a report as a PMT dictionary and back.
#include <gnuradio/halfplane/report_pmt.h>

#include <cmath>
#include <cstdint>
#include <cstdio>
#include <ctime>
#include <optional>
#include <stdexcept>
#include <string>
#include <utility>
#include <vector>

namespace gr::halfplane {
namespace {

using json = nlohmann::ordered_json;

/// (seconds since 1970, fraction) of "2026-02-28T12:34:56.789Z"; nothing where the text is no such time.
std::optional<std::pair<std::uint64_t, double>> parse_time(const std::string& text)
{
    std::tm parts{};
    int length = 0;
    if (std::sscanf(text.c_str(),
                    "%4d-%2d-%2dT%2d:%2d:%2d%n",
                    &parts.tm_year,
                    &parts.tm_mon,
                    &parts.tm_mday,
                    &parts.tm_hour,
                    &parts.tm_min,
                    &parts.tm_sec,
                    &length) != 6 ||
        text.empty() || text.back() != 'Z')
        return {};
    const std::string tail = text.substr(static_cast<std::size_t>(length));
    double fraction = 0;
    if (tail.size() > 1) {
        if (tail.front() != '.' || tail.find_first_not_of("0123456789", 1) != tail.size() - 1)
            return {};
        fraction = std::stod("0" + tail.substr(0, tail.size() - 1));
    }
    parts.tm_year -= 1900;
    parts.tm_mon -= 1;
    const std::time_t seconds = timegm(&parts);
    if (seconds < 0)
        return {};
    return std::pair{static_cast<std::uint64_t>(seconds), fraction};
}

std::string format_time(std::uint64_t seconds, double fraction)
{
    // Round to the microsecond first, so that a fraction of 0.9999999 carries into the seconds.
    auto micros = static_cast<std::uint64_t>(std::llround(fraction * 1e6));
    seconds += micros / 1000000;
    micros %= 1000000;
    const auto whole = static_cast<std::time_t>(seconds);
    std::tm parts{};
    gmtime_r(&whole, &parts);
    char date[32];
    std::strftime(date, sizeof date, "%Y-%m-%dT%H:%M:%S", &parts);
    char decimals[16];
    if (micros % 1000 == 0)
        std::snprintf(decimals, sizeof decimals, ".%03uZ", static_cast<unsigned>(micros / 1000));
    else
        std::snprintf(decimals, sizeof decimals, ".%06uZ", static_cast<unsigned>(micros));
    return std::string(date) + decimals;
}

pmt::pmt_t value_to_pmt(const std::string& key, const json& value)
{
    if (key == "time" && value.is_string())
        if (const auto time = parse_time(value.get<std::string>()))
            return pmt::make_tuple(pmt::from_uint64(time->first), pmt::from_double(time->second));
    return json_to_pmt(value);
}

bool is_time(const pmt::pmt_t& value)
{
    return pmt::is_tuple(value) && pmt::length(value) == 2 && pmt::is_uint64(pmt::tuple_ref(value, 0)) &&
           pmt::is_real(pmt::tuple_ref(value, 1));
}

json elements_to_json(const pmt::pmt_t& vector)
{
    json array = json::array();
    for (std::size_t k = 0; k < pmt::length(vector); ++k)
        array.push_back(pmt_to_json(pmt::vector_ref(vector, k)));
    return array;
}

json dict_to_json(const pmt::pmt_t& dict)
{
    json object = json::object();
    for (pmt::pmt_t items = pmt::dict_items(dict); pmt::is_pair(items); items = pmt::cdr(items)) {
        const pmt::pmt_t key = pmt::car(pmt::car(items)), value = pmt::cdr(pmt::car(items));
        if (!pmt::is_symbol(key))
            throw std::invalid_argument("pmt_to_json: a key is " + pmt::write_string(key) + ", not a symbol");
        if (pmt::is_u8vector(value) || pmt::is_c32vector(value))
            continue;
        object[pmt::symbol_to_string(key)] = pmt_to_json(value);
    }
    return object;
}

} // namespace

pmt::pmt_t json_to_pmt(const json& document)
{
    switch (document.type()) {
    case json::value_t::object: {
        // dict_add puts the newest key first: backwards, so that the order is kept.
        pmt::pmt_t dict = pmt::make_dict();
        std::vector<json::const_iterator> fields;
        for (auto field = document.begin(); field != document.end(); ++field)
            fields.push_back(field);
        for (auto field = fields.rbegin(); field != fields.rend(); ++field)
            dict = pmt::dict_add(dict, pmt::intern(field->key()), value_to_pmt(field->key(), field->value()));
        return dict;
    }
    case json::value_t::array: {
        pmt::pmt_t vector = pmt::make_vector(document.size(), pmt::PMT_NIL);
        for (std::size_t k = 0; k < document.size(); ++k)
            pmt::vector_set(vector, k, json_to_pmt(document[k]));
        return vector;
    }
    case json::value_t::string:
        return pmt::intern(document.get<std::string>());
    case json::value_t::boolean:
        return pmt::from_bool(document.get<bool>());
    case json::value_t::number_unsigned:
        return pmt::from_uint64(document.get<std::uint64_t>());
    case json::value_t::number_integer: {
        const auto number = document.get<std::int64_t>();
        return number < 0 ? pmt::from_long(number) : pmt::from_uint64(static_cast<std::uint64_t>(number));
    }
    case json::value_t::number_float:
        return pmt::from_double(document.get<double>());
    default:
        throw std::invalid_argument("json_to_pmt: null stands in the document, where only values are known");
    }
}

json pmt_to_json(const pmt::pmt_t& message)
{
    if (!message || pmt::is_null(message))
        return json::object();
    if (pmt::is_bool(message))
        return pmt::to_bool(message);
    if (pmt::is_uint64(message))
        return pmt::to_uint64(message);
    if (pmt::is_integer(message)) {
        const long number = pmt::to_long(message);
        return number < 0 ? json(number) : json(static_cast<std::uint64_t>(number));
    }
    if (pmt::is_real(message))
        return pmt::to_double(message);
    if (pmt::is_symbol(message))
        return pmt::symbol_to_string(message);
    if (is_time(message))
        return format_time(pmt::to_uint64(pmt::tuple_ref(message, 0)),
                           pmt::to_double(pmt::tuple_ref(message, 1)));
    if (pmt::is_dict(message))
        return dict_to_json(message);
    if (pmt::is_vector(message))
        return elements_to_json(message);
    throw std::invalid_argument("pmt_to_json: no such thing stands in a report: " +
                                pmt::write_string(message));
}

} // namespace gr::halfplane
