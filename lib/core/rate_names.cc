// SPDX-License-Identifier: GPL-3.0-or-later
// rate_names: detectors and rungs by the words users write, and decibels.
#include "halfplane/rates.h"

#include <cmath>
#include <stdexcept>

namespace halfplane {

detector parse_detector(const std::string& text)
{
    if (text == "automatic")
        return detector::automatic;
    if (text == "map")
        return detector::map;
    if (text == "ml")
        return detector::ml;
    throw std::invalid_argument("a detector is 'map', 'ml' or 'automatic', got '" + text + "'");
}

rung_name parse_rung(const std::string& text)
{
    for (const auto r : {rung_name::exact, rung_name::facing, rung_name::union_bound, rung_name::nearest})
        if (text == to_string(r))
            return r;
    throw std::invalid_argument("a rung is 'exact', 'facing', 'union' or 'nearest', got '" + text + "'");
}

const char* to_string(rung_name r) noexcept
{
    switch (r) {
    case rung_name::exact:
        return "exact";
    case rung_name::facing:
        return "facing";
    case rung_name::union_bound:
        return "union";
    default:
        return "nearest";
    }
}

double from_db(double db) noexcept
{
    return std::pow(10.0, db / 10);
}

double to_db(double ratio) noexcept
{
    return 10 * std::log10(ratio);
}

} // namespace halfplane
