// SPDX-License-Identifier: GPL-3.0-or-later
// tally: counting and merging.
#include "halfplane/tally.h"

#include <algorithm>
#include <array>
#include <cstring>
#include <numeric>

namespace halfplane {

namespace {

/// Adds to the counts by index. Four counts of each take turns: one alone would wait for itself wherever an
/// index comes back soon.
void count_sent(const std::uint16_t* index, std::size_t n, std::vector<std::uint64_t>& sent)
{
    constexpr std::size_t lanes = 4, most = 256;
    std::size_t k = 0;
    if (sent.size() <= most && n >= most) {
        std::array<std::array<std::uint32_t, most>, lanes> part{};
        for (const auto end = std::min<std::size_t>(n, std::uint32_t{1} << 31) / lanes * lanes; k < end;
             k += lanes)
            for (std::size_t lane = 0; lane < lanes; ++lane)
                ++part[lane][index[k + lane]];
        for (const auto& each : part)
            for (std::size_t i = 0; i < sent.size(); ++i)
                sent[i] += each[i];
    }
    for (; k < n; ++k)
        ++sent[index[k]];
}

/// How many symbols from the first on were surely decided right: whole groups of four.
std::size_t alike(const std::uint16_t* a, const std::uint16_t* b, std::size_t n)
{
    std::size_t k = 0;
    for (; k + 4 <= n; k += 4) {
        std::uint64_t one, other;
        std::memcpy(&one, a + k, sizeof one);
        std::memcpy(&other, b + k, sizeof other);
        if (one != other)
            break;
    }
    return k;
}

} // namespace

tally::tally(const signal_set& set)
    : sent(set.size(), 0), by_bit(set.label_bits(), 0), transitions(set.size()), d_labels(set.labels()),
      d_label_bits(set.label_bits())
{
}

void tally::count(const std::uint16_t* sent_index, const std::uint16_t* decided, std::size_t n)
{
    count_sent(sent_index, n, sent);
    for (std::size_t k = 0; k < n; ++k) {
        k += alike(sent_index + k, decided + k, n - k);
        if (k == n)
            break;
        const auto from = sent_index[k], to = decided[k];
        if (from == to)
            continue;
        ++symbol_errors;
        transitions.add(from, to);
        const unsigned wrong = d_labels[from] ^ d_labels[to];
        const auto h = static_cast<std::uint64_t>(label_distance(d_labels[from], d_labels[to]));
        bit_errors += h;
        bit_errors_squared += h * h;
        for (unsigned bit = 0; bit < d_label_bits; ++bit)
            by_bit[bit] += wrong >> (d_label_bits - 1 - bit) & 1;
    }
    symbols += n;
    bits += std::uint64_t{n} * d_label_bits;
}

void tally::merge(const tally& later)
{
    symbols += later.symbols;
    symbol_errors += later.symbol_errors;
    bits += later.bits;
    bit_errors += later.bit_errors;
    bit_errors_squared += later.bit_errors_squared;
    nonfinite += later.nonfinite;
    live += later.live;
    decoded += later.decoded;
    for (std::size_t k = 0; k < excluded.size(); ++k)
        excluded[k] += later.excluded[k];
    for (std::size_t k = 0; k < sent.size(); ++k)
        sent[k] += later.sent[k];
    for (std::size_t k = 0; k < by_bit.size(); ++k)
        by_bit[k] += later.by_bit[k];
    transitions.merge(later.transitions);
}

std::uint64_t tally::accounted() const
{
    return std::accumulate(excluded.begin(), excluded.end(), symbols + nonfinite + live + decoded);
}

double tally::bit_dispersion() const
{
    return bit_errors == 0 ? 1 : static_cast<double>(bit_errors_squared) / static_cast<double>(bit_errors);
}

} // namespace halfplane
