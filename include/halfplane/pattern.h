// SPDX-License-Identifier: GPL-3.0-or-later
// pattern: the known symbols that both ends of a link agree on.
#pragma once

#include "halfplane/signal_set.h"

#include <cstdint>
#include <memory>
#include <string>
#include <vector>

namespace halfplane {

/*!
 * A periodic sequence of point indices. Built from what a user writes as PATTERN:
 * `o150:N` (ITU-T O.150, N = 9, 11, 15, 20, 23, 29, 31 stages), `draw:SEED[:PERIOD]` (indices by prior,
 * SplitMix64, period 4096 unless said), `file:PATH` (text: bits, or indices with spaces).
 */
class pattern
{
public:
    /// \throws std::invalid_argument naming the part that is not understood, or why the set cannot carry it
    pattern(const std::string& text, const signal_set& set);

    enum class kind { shift_register, draw, file };
    kind type() const noexcept { return d_kind; }
    const std::string& text() const noexcept { return d_text; }

    /// Period in symbols: after as many the indices repeat.
    std::uint64_t period() const noexcept { return d_period; }

    /// Index of symbol k, any k (taken modulo the period). O(1) amortised for ascending k.
    /// Writes `count` indices from symbol `first` on.
    void indices(std::uint64_t first, std::size_t count, std::uint16_t* out) const;

    /// Stages and feedback tap of x^n + x^tap + 1, and whether the output is inverted; shift_register only.
    unsigned stages() const noexcept { return d_stages; }
    unsigned tap() const noexcept { return d_tap; }
    bool inverted() const noexcept { return d_inverted; }

private:
    kind d_kind{};
    std::string d_text;
    std::uint64_t d_period = 0;
    unsigned d_stages = 0, d_tap = 0;
    bool d_inverted = false;
    unsigned d_label_bits = 0;
    std::vector<std::uint16_t> d_table;         // one period where it is short
    std::vector<std::uint16_t> d_index_of_label; // shift_register and bit files
};

} // namespace halfplane
