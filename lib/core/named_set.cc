// SPDX-License-Identifier: GPL-3.0-or-later
// named_set: what a name means, the listing, and a hint for names that are nearly right.
#include "halfplane/set_file.h"

#include "families.h"
#include "number_text.h"
#include "refusal.h"
#include "standard_sets.h"

#include <algorithm>
#include <numeric>
#include <string_view>

namespace halfplane {

namespace {

using detail::refuse;
using words = std::vector<std::string>;

words split(const std::string& text, char at)
{
    words parts{""};
    for (char c : text)
        if (c == at)
            parts.emplace_back();
        else
            parts.back() += c;
    return parts;
}

std::size_t count_of(const std::string& text, const char* what)
{
    std::size_t value = 0;
    for (char c : text) {
        if (c < '0' || c > '9' || value > signal_set::max_size)
            refuse<invalid_set>(
                what, " must be a whole number up to ", signal_set::max_size, ", got \"", text, "\"");
        value = 10 * value + static_cast<std::size_t>(c - '0');
    }
    if (value == 0 || value > signal_set::max_size)
        refuse<invalid_set>(what, " must be 1 to ", signal_set::max_size, ", got \"", text, "\"");
    return value;
}

/// "4+12+16" and "2.84,5.27" of apsk:4+12+16:2.84,5.27.
struct ring_plan {
    std::vector<std::size_t> counts;
    std::vector<double> ratios;
};

ring_plan parse_rings(const words& arguments)
{
    ring_plan plan;
    for (const auto& word : split(arguments[0], '+'))
        plan.counts.push_back(count_of(word, "the points of a ring"));
    if (arguments.size() > 1)
        for (const auto& word : split(arguments[1], ',')) {
            const double ratio = detail::parse_number(word);
            const double before = plan.ratios.empty() ? 1 : plan.ratios.back();
            if (!(ratio > before && ratio < 1e6))
                refuse<invalid_set>("radius ratio ",
                                    plan.ratios.size() + 1,
                                    " must be a number above ",
                                    before,
                                    ", got \"",
                                    word,
                                    "\"");
            plan.ratios.push_back(ratio);
        }
    return plan;
}

signal_set star(const words& arguments)
{
    auto plan = parse_rings(arguments);
    for (std::size_t n : plan.counts)
        if (n != plan.counts.front())
            refuse<invalid_set>("star has as many points on every ring (apsk takes any), got ", arguments[0]);
    if (plan.counts.front() == 1)
        refuse<invalid_set>("star needs at least 2 points a ring, got ", arguments[0]);
    if (arguments.size() == 1)
        for (std::size_t r = 2; r <= plan.counts.size(); ++r)
            plan.ratios.push_back(static_cast<double>(r));
    return detail::rings(plan.counts, plan.ratios, detail::ring_start::on_axis);
}

signal_set apsk(const words& arguments)
{
    const auto plan = parse_rings(arguments);
    return detail::rings(plan.counts, plan.ratios, detail::ring_start::half_step);
}

struct family {
    const char* keyword;
    std::size_t most_arguments;
    signal_set (*make)(const words&);
    named_set_entry entry;
};

const std::vector<family>& families()
{
    static const std::string own = "own rule, frozen by a table in the tests";
    static const std::vector<family> all{
        {"psk",
         1,
         [](const words& a) { return detail::psk(count_of(a[0], "the size")); },
         {"psk:8", "M points on a circle of radius 1, Gray for even M", own}},
        {"qam",
         1,
         [](const words& a) { return detail::qam(count_of(a[0], "the size")); },
         {"qam:16", "square or 2:1 rectangular grid on odd integers, Gray; M a power of two", own}},
        {"cross",
         1,
         [](const words& a) { return detail::cross(count_of(a[0], "the size")); },
         {"cross:32",
          "square grid without its corners on odd integers; M = 32, 128, 512, 2048; searched labels",
          own}},
        {"hex",
         1,
         [](const words& a) { return detail::hex(count_of(a[0], "the size")); },
         {"hex:19", "M points of the hexagonal lattice of least energy, d_min 2, natural labels", own}},
        {"star",
         2,
         star,
         {"star:4+4",
          "rings of equal count on common rays, radii 1, 2, 3 … or star:N+N:RATIO,…, natural labels",
          own}},
        {"apsk",
         2,
         apsk,
         {"apsk:4+12:2.85",
          "rings of any count, half a step off the axis, radius ratios after the colon, natural labels",
          own}},
    };
    return all;
}

/// Levenshtein distance.
std::size_t edits(std::string_view a, std::string_view b)
{
    std::vector<std::size_t> row(b.size() + 1);
    std::iota(row.begin(), row.end(), std::size_t{0});
    for (std::size_t i = 1; i <= a.size(); ++i) {
        std::size_t diagonal = row[0];
        row[0] = i;
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t above = row[j];
            row[j] = std::min({above + 1, row[j - 1] + 1, diagonal + (a[i - 1] != b[j - 1])});
            diagonal = above;
        }
    }
    return row.back();
}

std::string closest_name(const std::string& name)
{
    const named_set_entry* best = nullptr;
    std::size_t least = 0;
    const std::string start = name.substr(0, 200); // a name, not a document
    for (const auto& entry : named_sets()) {
        const std::size_t distance = edits(start, entry.name);
        if (!best || distance < least) {
            best = &entry;
            least = distance;
        }
    }
    return best->name;
}

} // namespace

signal_set named_set(const std::string& name)
{
    const auto colon = name.find(':');
    const std::string keyword = name.substr(0, colon);
    if (keyword == "std")
        for (const auto& standard : detail::standard_sets())
            if (standard.entry.name == name)
                return standard.make().renamed(name, standard.entry.source);
    if (colon != std::string::npos)
        for (const auto& f : families())
            if (f.keyword == keyword) {
                const auto arguments = split(name.substr(colon + 1), ':');
                try {
                    if (arguments.size() > f.most_arguments)
                        refuse<invalid_set>("too many colons, expected something like ", f.entry.name);
                    return f.make(arguments).renamed(name);
                } catch (const invalid_set& e) {
                    refuse<invalid_set>("\"", name, "\": ", e.what());
                }
            }
    refuse<invalid_set>("no constellation is named \"", name, "\"; the closest name is ", closest_name(name));
}

const std::vector<named_set_entry>& named_sets()
{
    static const std::vector<named_set_entry> all = [] {
        std::vector<named_set_entry> list;
        for (const auto& f : families())
            list.push_back(f.entry);
        for (const auto& s : detail::standard_sets())
            list.push_back(s.entry);
        return list;
    }();
    return all;
}

} // namespace halfplane
