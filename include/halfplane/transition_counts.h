// SPDX-License-Identifier: GPL-3.0-or-later
// transition_counts: how often each symbol was taken for which other one.
#pragma once

#include "halfplane/carry.h"

#include <cstddef>
#include <cstdint>
#include <vector>

namespace halfplane {

/// One kind of symbol error and how often it was counted.
struct transition {
    std::uint16_t from, to; ///< indices sent and decided
    std::uint64_t count;
};

/*!
 * Counts by (sent, decided). Sets of up to `dense_limit` points use a plain M × M table; beyond, an
 * open-addressing hash table, so that an empty window of a large set costs nothing and the memory follows the
 * pairs that occur.
 */
class transition_counts
{
public:
    static constexpr std::size_t dense_limit = 64;

    explicit transition_counts(std::size_t size);

    /// Adds `count` (> 0) to the pair; both indices below the set's size.
    void add(std::uint16_t from, std::uint16_t to, std::uint64_t count = 1);
    void merge(const transition_counts& later);
    /// How often this pair was counted.
    std::uint64_t count(std::uint16_t from, std::uint16_t to) const;
    /// Every counted pair, ascending by (from, to).
    std::vector<transition> sorted() const;
    /// Counted pairs alone, in rows of [from, to, count]. See carry.h.
    void carry(carry_writer& a) const;
    void carry(carry_reader& a);

private:
    struct slot {
        std::uint32_t key;
        std::uint64_t count; ///< 0: the slot is free
    };
    std::size_t place(std::uint32_t key) const;
    void grow();

    std::size_t d_size;
    std::vector<std::uint64_t> d_dense;
    std::vector<slot> d_slots; ///< a power of two long, at most half full
    std::size_t d_used = 0;
};

} // namespace halfplane
