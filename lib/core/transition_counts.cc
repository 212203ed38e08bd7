// SPDX-License-Identifier: GPL-3.0-or-later
// transition_counts: dense table or hash table of (sent, decided) pairs.
#include "halfplane/transition_counts.h"

#include <algorithm>
#include <tuple>

namespace halfplane {

namespace {

std::uint32_t key_of(std::uint16_t from, std::uint16_t to)
{
    return std::uint32_t{from} << 16 | to;
}

} // namespace

transition_counts::transition_counts(std::size_t size) : d_size(size)
{
    if (size <= dense_limit)
        d_dense.assign(size * size, 0);
}

/// The slot that holds the key, or the free one where it belongs (linear probing, Fibonacci hashing).
std::size_t transition_counts::place(std::uint32_t key) const
{
    const std::size_t mask = d_slots.size() - 1;
    std::size_t at = (key * std::uint64_t{0x9e3779b97f4a7c15}) >> 32 & mask;
    while (d_slots[at].count != 0 && d_slots[at].key != key)
        at = (at + 1) & mask;
    return at;
}

void transition_counts::grow()
{
    std::vector<slot> old(std::max<std::size_t>(64, 2 * d_slots.size()), slot{0, 0});
    old.swap(d_slots);
    for (const auto& s : old)
        if (s.count != 0)
            d_slots[place(s.key)] = s;
}

void transition_counts::add(std::uint16_t from, std::uint16_t to, std::uint64_t count)
{
    if (!d_dense.empty()) {
        d_dense[from * d_size + to] += count;
        return;
    }
    if (2 * (d_used + 1) > d_slots.size())
        grow();
    auto& s = d_slots[place(key_of(from, to))];
    if (s.count == 0) {
        s.key = key_of(from, to);
        ++d_used;
    }
    s.count += count;
}

void transition_counts::merge(const transition_counts& later)
{
    for (std::size_t k = 0; k < later.d_dense.size(); ++k)
        d_dense[k] += later.d_dense[k];
    for (const auto& s : later.d_slots)
        if (s.count != 0)
            add(static_cast<std::uint16_t>(s.key >> 16), static_cast<std::uint16_t>(s.key), s.count);
}

std::uint64_t transition_counts::count(std::uint16_t from, std::uint16_t to) const
{
    if (!d_dense.empty())
        return d_dense[from * d_size + to];
    return d_slots.empty() ? 0 : d_slots[place(key_of(from, to))].count;
}

std::vector<transition> transition_counts::sorted() const
{
    std::vector<transition> all;
    for (std::size_t k = 0; k < d_dense.size(); ++k)
        if (d_dense[k] != 0)
            all.push_back(
                {static_cast<std::uint16_t>(k / d_size), static_cast<std::uint16_t>(k % d_size), d_dense[k]});
    for (const auto& s : d_slots)
        if (s.count != 0)
            all.push_back(
                {static_cast<std::uint16_t>(s.key >> 16), static_cast<std::uint16_t>(s.key), s.count});
    std::sort(all.begin(), all.end(), [](const transition& a, const transition& b) {
        return std::tie(a.from, a.to) < std::tie(b.from, b.to);
    });
    return all;
}

void transition_counts::carry(carry_writer& a) const
{
    std::vector<std::array<std::uint64_t, 3>> rows;
    for (const auto& t : sorted())
        rows.push_back({t.from, t.to, t.count});
    a("rows", rows);
}

void transition_counts::carry(carry_reader& a)
{
    nlohmann::json rows;
    a("rows", rows);
    transition_counts fresh(d_size);
    for (const auto& row : rows) {
        const auto from = row.at(0).get<std::uint64_t>(), to = row.at(1).get<std::uint64_t>(),
                   count = row.at(2).get<std::uint64_t>();
        if (from >= d_size || to >= d_size || count == 0)
            throw std::invalid_argument("a transition reads " + row.dump());
        fresh.add(static_cast<std::uint16_t>(from), static_cast<std::uint16_t>(to), count);
    }
    *this = std::move(fresh);
}

} // namespace halfplane
