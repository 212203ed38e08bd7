// SPDX-License-Identifier: GPL-3.0-or-later
// pattern: the known symbols that both ends of a link agree on.
#pragma once

#include "halfplane/shift_register.h"
#include "halfplane/signal_set.h"

#include <cstdint>
#include <memory>
#include <string>
#include <vector>

namespace halfplane {

/*!
 * A periodic sequence of point indices. Built from what a user writes as PATTERN:
 *
 * - `o150:N`: ITU-T O.150, N = 9, 11, 15, 20, 23, 29, 31 stages. Bit 0 is the first of the register full of
 *   ones; bits fill labels leftmost bit first. Needs a point for every label.
 * - `draw:SEED[:PERIOD]`: indices by prior, drawn by SplitMix64 from SEED (0 … 2^64 − 1, decimal), PERIOD
 *   symbols (1 … 2^24, 4096 unless said). Symbol k is the smallest index i with u < C_i, u the upper 32 bits
 * of the k-th output of the generator, C_i = ⌊2^32·(p_0 + … + p_i)⌋; equal priors count as exactly 1/M.
 * - `file:PATH`: text. Lines of 0 and 1 without spaces within are bits and fill labels as above (so a point
 *   for every label is needed); anything else is decimal indices with white space between.
 *
 * Immutable; const members may be called from several threads.
 */
class pattern
{
public:
    static constexpr std::uint64_t default_draw_period = 4096;
    static constexpr std::uint64_t max_draw_period = std::uint64_t{1} << 24;

    /// \throws std::invalid_argument naming the part that is not understood (for files: file, line and
    /// value), or why the set cannot carry the pattern
    pattern(const std::string& text, const signal_set& set);

    enum class kind { shift_register, draw, file };
    kind type() const noexcept { return d_kind; }
    const std::string& text() const noexcept { return d_text; }

    /// Period in symbols: after as many the indices repeat.
    std::uint64_t period() const noexcept { return d_period; }
    /// Whether bits are what the pattern is made of; then complementing them all is another pattern.
    bool carries_bits() const noexcept { return d_carries_bits; }

    /// Writes `count` indices from symbol `first` on, any `first` (taken modulo the period).
    void indices(std::uint64_t first, std::size_t count, std::uint16_t* out) const;

    /// Stages and feedback tap of x^n + x^tap + 1, and whether the output is inverted; shift_register only,
    /// else 0.
    unsigned stages() const noexcept { return d_stages; }
    unsigned tap() const noexcept { return d_tap; }
    bool inverted() const noexcept { return d_inverted; }

    /*!
     * Reads the pattern onward without seeking for every stretch. Keeps a reference to the pattern.
     */
    class reader
    {
    public:
        explicit reader(const pattern& p);
        /// The next symbol is symbol `symbol`, modulo the period.
        void seek(std::uint64_t symbol);
        /// shift_register only: the next symbol begins with bit `bit` of the sequence. Where the bits of a
        /// label and the period share a divisor, not every bit begins a symbol of the pattern as indices()
        /// has it.
        void seek_bit(std::uint64_t bit);
        /// The next `count` indices.
        void next(std::size_t count, std::uint16_t* out);

    private:
        const pattern* d_pattern;
        bool d_from_register = false;
        std::uint64_t d_symbol = 0;
        halfplane::shift_register d_register;
    };

private:
    void build_register(const std::string& stages, const signal_set& set);
    void build_draw(const std::string& seed_and_period, const signal_set& set);
    void build_file(const std::string& path, const signal_set& set);

    kind d_kind{};
    std::string d_text;
    std::uint64_t d_period = 0;
    unsigned d_stages = 0, d_tap = 0;
    bool d_inverted = false, d_carries_bits = false;
    unsigned d_label_bits = 0;
    std::vector<std::uint16_t> d_table;          // one period where it is short
    std::vector<std::uint16_t> d_index_of_label; // shift_register and bit files
};

} // namespace halfplane
