// SPDX-License-Identifier: GPL-3.0-or-later
// pair_classes: grouping by exactly equal distances.
#include "pair_classes.h"

#include <algorithm>
#include <cmath>
#include <unordered_map>

namespace halfplane {

namespace {

pair_class class_of(const signal_set& set, std::size_t i, std::size_t j)
{
    const double p = set.priors()[i] + set.priors()[j];
    const double share =
        static_cast<double>(label_distance(set.labels()[i], set.labels()[j])) / set.label_bits();
    return {std::abs(set.points()[i] - set.points()[j]), p, p * share};
}

void sort_by_distance(std::vector<pair_class>& classes)
{
    std::sort(classes.begin(), classes.end(), [](const pair_class& a, const pair_class& b) {
        return a.distance < b.distance;
    });
}

} // namespace

std::vector<pair_class> classes_of(const signal_set& set, const index_pairs& pairs)
{
    std::vector<pair_class> all, out;
    for (const auto& [i, j] : pairs)
        all.push_back(class_of(set, i, j));
    sort_by_distance(all);
    for (const auto& c : all) {
        if (out.empty() || out.back().distance != c.distance)
            out.push_back({c.distance, 0, 0});
        out.back().ser_weight += c.ser_weight;
        out.back().ber_weight += c.ber_weight;
    }
    return out;
}

std::optional<std::vector<pair_class>> classes_of_all(const signal_set& set)
{
    constexpr std::size_t most = 1 << 16;
    std::unordered_map<double, pair_class> by_distance;
    const std::size_t m = set.size();
    for (std::size_t i = 0; i < m; ++i) {
        for (std::size_t j = i + 1; j < m; ++j) {
            const auto c = class_of(set, i, j);
            auto& sum = by_distance[c.distance];
            sum.distance = c.distance;
            sum.ser_weight += c.ser_weight;
            sum.ber_weight += c.ber_weight;
        }
        if (by_distance.size() > most)
            return std::nullopt;
    }
    std::vector<pair_class> out;
    for (const auto& entry : by_distance)
        out.push_back(entry.second);
    sort_by_distance(out);
    return out;
}

index_pairs closest_pairs(const signal_set& set)
{
    const double limit = set.d_min() * (1 + 1e-9);
    std::vector<std::uint16_t> order(set.size());
    for (std::size_t i = 0; i < order.size(); ++i)
        order[i] = static_cast<std::uint16_t>(i);
    const auto& at = set.points();
    std::sort(order.begin(), order.end(), [&](std::uint16_t a, std::uint16_t b) {
        return at[a].real() < at[b].real();
    });
    index_pairs out;
    for (std::size_t a = 0; a < order.size(); ++a)
        for (std::size_t b = a + 1; b < order.size() && at[order[b]].real() - at[order[a]].real() <= limit;
             ++b)
            if (std::abs(at[order[a]] - at[order[b]]) <= limit)
                out.emplace_back(order[a], order[b]);
    return out;
}

} // namespace halfplane
