// SPDX-License-Identifier: GPL-3.0-or-later
// thinned_samples: which samples of a long stream are kept.
#include "halfplane/blind_gauge.h"

#include <algorithm>

namespace halfplane {

namespace {

/// The finaliser of splitmix64 (Steele, Lea, Flood 2014), a bijection of 64-bit words.
std::uint64_t mixed(std::uint64_t x)
{
    x += 0x9e3779b97f4a7c15u;
    x = (x ^ x >> 30) * 0xbf58476d1ce4e5b9u;
    x = (x ^ x >> 27) * 0x94d049bb133111ebu;
    return x ^ x >> 31;
}

} // namespace

void thinned_samples::add(const std::complex<float>* in, std::uint64_t first, std::size_t n)
{
    d_seen += n;
    for (std::size_t k = 0; k < n; ++k) {
        const auto word = mixed(first + k);
        if ((word & ((std::uint64_t{1} << d_level) - 1)) != 0)
            continue;
        d_kept.push_back(in[k]);
        d_rank.push_back(static_cast<std::uint8_t>(word == 0 ? 63 : __builtin_ctzll(word)));
        if (d_kept.size() > capacity) {
            ++d_level;
            thin();
        }
    }
}

void thinned_samples::merge(const thinned_samples& later)
{
    d_seen += later.d_seen;
    d_level = std::max(d_level, later.d_level);
    d_kept.insert(d_kept.end(), later.d_kept.begin(), later.d_kept.end());
    d_rank.insert(d_rank.end(), later.d_rank.begin(), later.d_rank.end());
    thin();
    while (d_kept.size() > capacity) {
        ++d_level;
        thin();
    }
}

/// Keeps what stays at the present level.
void thinned_samples::thin()
{
    std::size_t n = 0;
    for (std::size_t k = 0; k < d_kept.size(); ++k)
        if (d_rank[k] >= d_level) {
            d_kept[n] = d_kept[k];
            d_rank[n++] = d_rank[k];
        }
    d_kept.resize(n);
    d_rank.resize(n);
}

} // namespace halfplane
