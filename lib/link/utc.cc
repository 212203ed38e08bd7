// SPDX-License-Identifier: GPL-3.0-or-later
// utc: the calendar is Boost's, the clock is ours.
#include "utc.h"

#include <boost/date_time/gregorian/gregorian_types.hpp>

#include <cmath>
#include <cstdio>
#include <regex>
#include <stdexcept>

namespace halfplane::link {

namespace {

using boost::gregorian::date;

std::int64_t days_since_1970(const date& day)
{
    return (day - date(1970, 1, 1)).days();
}

} // namespace

std::optional<utc_moment> parse_utc(const std::string& text)
{
    static const std::regex form(
        R"((\d{4})-(\d\d)-(\d\d)[Tt ](\d\d):(\d\d):(\d\d)(\.\d{1,15})?([Zz]|([+-])(\d\d):(\d\d)))");
    std::smatch part;
    if (text.size() > 64 || !std::regex_match(text, part, form))
        return std::nullopt;
    const auto number = [&](std::size_t k) { return part[k].matched ? std::stoi(part[k]) : 0; };
    if (number(4) > 23 || number(5) > 59 || number(6) > 60 || number(10) > 23 || number(11) > 59)
        return std::nullopt;
    std::int64_t days;
    try {
        days = days_since_1970(date(static_cast<unsigned short>(number(1)),
                                    static_cast<unsigned short>(number(2)),
                                    static_cast<unsigned short>(number(3))));
    } catch (const std::out_of_range&) {
        return std::nullopt; // no such day, or before Boost's year 1400
    }
    const int offset = (part[9] == "-" ? -1 : 1) * (number(10) * 60 + number(11)) * 60;
    utc_moment moment{days * 86400 + number(4) * 3600 + number(5) * 60 + number(6) - offset, 0, 1};
    if (part[7].matched) {
        moment.fraction = std::stod("0" + part[7].str());
        moment.resolution = std::pow(10.0, 1 - static_cast<double>(part[7].length()));
    }
    return moment;
}

std::string utc_text(const utc_moment& from, double later)
{
    const double whole = std::floor(later), rest = from.fraction + (later - whole);
    // A tenth of a microsecond is what a time of hours in double may have lost.
    auto milliseconds = static_cast<std::int64_t>(std::floor(rest * 1e3 + 1e-4));
    std::int64_t seconds = from.seconds + static_cast<std::int64_t>(whole) + milliseconds / 1000;
    milliseconds %= 1000;
    const std::int64_t in_day = ((seconds % 86400) + 86400) % 86400;
    const date day = date(1970, 1, 1) + boost::gregorian::date_duration((seconds - in_day) / 86400);
    char text[40];
    std::snprintf(text,
                  sizeof text,
                  "%04d-%02d-%02dT%02d:%02d:%02d.%03dZ",
                  static_cast<int>(day.year()),
                  static_cast<int>(day.month()),
                  static_cast<int>(day.day()),
                  static_cast<int>(in_day / 3600),
                  static_cast<int>(in_day / 60 % 60),
                  static_cast<int>(in_day % 60),
                  static_cast<int>(milliseconds));
    return text;
}

} // namespace halfplane::link
