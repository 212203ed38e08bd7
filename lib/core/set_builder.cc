// SPDX-License-Identifier: GPL-3.0-or-later
// set_builder: the rules of a set file that need its rows to be named.
#include "set_builder.h"

#include "refusal.h"

#include <cmath>

namespace halfplane::detail {

std::string one_line(const std::string& text)
{
    constexpr std::size_t longest = 60;
    std::string shown;
    for (std::size_t k = 0; k < text.size() && k < longest; ++k) {
        const auto c = static_cast<unsigned char>(text[k]);
        shown += c < 0x20 || c == 0x7f ? '?' : text[k];
    }
    return shown + (text.size() > longest ? "…" : "");
}

std::string stem(const std::string& source)
{
    const auto slash = source.find_last_of('/');
    std::string name = slash == std::string::npos ? source : source.substr(slash + 1);
    const auto dot = name.find_last_of('.');
    return dot == std::string::npos || dot == 0 ? name : name.substr(0, dot);
}

void set_builder::add(
    std::string where, const std::string& label, double i, double q, std::optional<double> prior)
{
    const std::string place = d_source + ": " + where + ": ";
    const std::size_t index = d_points.size();
    if (index == signal_set::max_size)
        refuse<invalid_set>(place, "a set has at most ", signal_set::max_size, " points");

    if (label.empty() || label.size() > signal_set::max_label_bits ||
        label.find_first_not_of("01") != std::string::npos)
        refuse<invalid_set>(place,
                            "field \"label\": must be 1 to ",
                            signal_set::max_label_bits,
                            " characters 0 or 1, got ",
                            quoted(label));
    if (index == 0)
        d_label_length = label.size();
    if (label.size() != d_label_length)
        refuse<invalid_set>(place,
                            "field \"label\": all labels must have one length; ",
                            d_where.front(),
                            " has ",
                            d_label_length,
                            " bits, got ",
                            quoted(label));
    const auto bits = static_cast<label_t>(std::stoul(label, nullptr, 2));
    if (const auto [other, added] = d_index_of_label.emplace(bits, index); !added)
        refuse<invalid_set>(
            place, "field \"label\": ", quoted(label), " is already the label of ", d_where[other->second]);

    for (const auto& [name, value] : {std::pair{"i", i}, std::pair{"q", q}})
        if (!std::isfinite(value))
            refuse<invalid_set>(place, "field \"", name, "\": must be a finite number, got ", value);
    // + 0.0 makes −0 and 0 one key.
    if (const auto [other, added] = d_index_of_point.emplace(std::pair{i + 0.0, q + 0.0}, index); !added)
        refuse<invalid_set>(
            place, "the point (", i, ", ", q, ") is already given by ", d_where[other->second]);

    if (index > 0 && prior.has_value() != !d_priors.empty())
        refuse<invalid_set>(place,
                            "field \"p\": give it at every point or at none; ",
                            d_where.front(),
                            d_priors.empty() ? " has none" : " has one");
    if (prior) {
        if (!std::isfinite(*prior) || *prior <= 0)
            refuse<invalid_set>(place, "field \"p\": must be a positive number, got ", *prior);
        d_priors.push_back(*prior);
    }
    d_points.emplace_back(i, q);
    d_labels.push_back(bits);
    d_where.push_back(std::move(where));
}

signal_set set_builder::finish(std::string name, std::string note) const
{
    try {
        return {d_points,
                d_labels,
                static_cast<unsigned>(d_points.empty() ? 1 : d_label_length),
                d_priors,
                name.empty() ? stem(d_source) : std::move(name),
                std::move(note)};
    } catch (const invalid_set& e) {
        refuse<invalid_set>(d_source, ": ", e.what());
    }
}

} // namespace halfplane::detail
