// SPDX-License-Identifier: GPL-3.0-or-later
// bit_classes: exact counts by look, summed from near to far until nothing more can matter.
#include "bit_classes.h"

#include "scaled_wedge.h"

#include <numeric>
#include <unordered_map>

namespace halfplane {

namespace {

struct same_look {
    bool operator()(const edge_view& a, const edge_view& b) const
    {
        return a.height == b.height && a.from == b.from && a.to == b.to;
    }
};

struct look_hash {
    std::size_t operator()(const edge_view& v) const
    {
        const std::hash<double> h;
        return h(v.height) * 0x9E3779B97F4A7C15u ^ h(v.from) * 0xBF58476D1CE4E5B9u ^ h(v.to);
    }
};

} // namespace

std::optional<bit_classes> bit_classes::of(const scene& s)
{
    // Where looks hardly ever come back, the walls near a point are found faster by their blocks.
    constexpr std::size_t few = 1024, gain = 4;
    if (!s.set->uniform())
        return std::nullopt;
    bit_classes out;
    out.d_bits = s.set->label_bits();
    out.d_weight = s.set->priors()[0];
    std::unordered_map<edge_view, std::size_t, look_hash, same_look> known;
    std::size_t seen = 0;
    std::vector<entry> entries;
    std::vector<double> counts;
    for (const auto& a : s.arrivals) {
        const label_t sent = s.set->labels()[a.sent];
        for (const auto& border : s.walls->walls) {
            const auto v = border.line.seen_from(a.mean);
            const auto look = either_way(v);
            const auto [place, fresh] = known.try_emplace(look, entries.size());
            if (fresh) {
                entries.push_back({look, squared_approach(look)});
                counts.resize(counts.size() + out.d_bits, 0);
            }
            const label_t wrong_near = border.wrong_on_near_side(v, sent);
            for (unsigned k = 0; k < out.d_bits; ++k)
                if (border.mask >> k & 1)
                    counts[place->second * out.d_bits + (out.d_bits - 1 - k)] +=
                        (wrong_near >> k & 1) ? -1 : 1;
        }
        seen += s.walls->walls.size();
        if (entries.size() > few && entries.size() * gain > seen)
            return std::nullopt;
    }

    std::vector<std::size_t> order(entries.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return entries[a].approach < entries[b].approach;
    });
    for (const auto k : order) {
        out.d_entries.push_back(entries[k]);
        const auto first = counts.begin() + static_cast<std::ptrdiff_t>(k * out.d_bits);
        out.d_counts.insert(out.d_counts.end(), first, first + out.d_bits);
    }
    out.d_beyond.resize(out.d_counts.size());
    for (std::size_t n = out.d_counts.size(); n-- > 0;)
        out.d_beyond[n] = std::abs(out.d_counts[n]) +
                          (n + out.d_bits < out.d_beyond.size() ? out.d_beyond[n + out.d_bits] : 0);
    return out;
}

std::vector<double> bit_classes::wrong_bits(const scaled_wedge& w) const
{
    constexpr double negligible = 1e-15;
    std::vector<double> sum(d_bits, 0);
    for (std::size_t n = 0; n < d_entries.size(); ++n) {
        const double* counts = &d_counts[n * d_bits];
        // No wedge is more than half the tail at its nearest place, here or farther out.
        const double most = 0.5 * std::exp(w.relative_ln_tail(d_entries[n].approach));
        bool matters = false;
        for (unsigned k = 0; k < d_bits; ++k)
            matters |= d_beyond[n * d_bits + k] * most > negligible * sum[k];
        if (!matters)
            break;
        const double p = w(d_entries[n].look);
        for (unsigned k = 0; k < d_bits; ++k)
            sum[k] += counts[k] * p;
    }
    for (double& p : sum)
        p *= d_weight;
    return sum;
}

} // namespace halfplane
