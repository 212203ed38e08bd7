// SPDX-License-Identifier: GPL-3.0-or-later
// block_counts: whether errors come in bursts, from their counts in blocks of every length.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <optional>

namespace halfplane {

/*!
 * Counts errors in consecutive blocks of 64, 128, 256 … judged symbols at once: each length keeps the number
 * of blocks, Σe and Σe². A copy is a snapshot of the run so far.
 */
class block_counts
{
public:
    static constexpr std::size_t shortest = 64;       ///< symbols of the shortest block
    static constexpr std::uint64_t least_blocks = 16; ///< blocks a length needs before it is heard
    static constexpr std::uint64_t least_errors = 20; ///< errors below which the question is left open
    static constexpr double significance =
        0.001; ///< chance to cry burst at independent errors, over all lengths

    /// `n` judged symbols in order: indices sent and decided.
    void add(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t n);

    /// The same for steps of any kind (bits, frames): some without an error, or one with.
    void add_clear(std::uint64_t steps);
    void add_error();

    /*!
     * Variance of the error counts over what independent symbols give (index of dispersion), the largest
     * among the block lengths at which it is significant; 1 where none is. Nothing below `least_errors`
     * errors, or where no length has `least_blocks` blocks yet.
     *
     * Significant means at both tests: X = Σ(e − ē)²/(ē(1 − p)) against χ² with K − 1 degrees of freedom
     * (Fisher's index), and the number of error pairs within blocks against a Poisson variable of the mean
     * that independent errors give; the first is wrong where blocks are nearly empty, the second where they
     * are full. Each at significance / number of lengths (Bonferroni).
     */
    std::optional<double> dispersion() const;

    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("levels", d_levels);
        a("open_symbols", d_open_symbols);
        a("open_errors", d_open_errors);
        a("errors", d_errors);
    }

private:
    static constexpr std::size_t lengths = 48;
    struct level {
        std::uint64_t blocks = 0, errors = 0;
        long double squares = 0;
        std::uint64_t half = 0; ///< errors of a first half that waits for its second
        bool waiting = false;
        template <typename Archive>
        void carry(Archive& a)
        {
            a("blocks", blocks);
            a("errors", errors);
            a("squares", squares);
            a("half", half);
            a("waiting", waiting);
        }
    };
    void add(std::uint64_t steps, std::uint64_t errors);
    void close_block(std::uint64_t errors, std::size_t length = 0);
    void close_clear(std::uint64_t blocks);

    std::array<level, lengths> d_levels{};
    std::uint64_t d_open_symbols = 0, d_open_errors = 0; ///< of the shortest block under way
    std::uint64_t d_errors = 0;
};

} // namespace halfplane
