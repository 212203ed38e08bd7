// SPDX-License-Identifier: GPL-3.0-or-later
// tally: running counts of symbols, errors, bits, transitions, with the account of what was excluded.
#pragma once

#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"
#include "halfplane/transition_counts.h"

#include <array>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace halfplane {

/*!
 * Counts of one stretch of symbols. Two tallies of adjacent stretches add up with merge(). All counts are
 * 64-bit; nothing is ever averaged away.
 */
class tally
{
public:
    explicit tally(const signal_set& set);

    /// `n` judged symbols: indices sent and decided, all below set.size() (not checked).
    void count(const std::uint16_t* sent_index, const std::uint16_t* decided, std::size_t n);
    /// One judged symbol.
    void count(std::uint16_t sent_index, std::uint16_t decided) { count(&sent_index, &decided, 1); }
    void count_nonfinite() { ++nonfinite; }
    void count_excluded(exclusion cause) { ++excluded[-1 - static_cast<int>(cause)]; }
    void merge(const tally& later);

    std::uint64_t symbols = 0, symbol_errors = 0; ///< judged, and of these in error
    std::uint64_t bits = 0, bit_errors = 0;
    std::uint64_t bit_errors_squared = 0; ///< Σh² over erroneous symbols, h the wrong bits of one symbol
    std::uint64_t nonfinite = 0;          ///< NaN or Inf where a reference was known
    std::array<std::uint64_t, exclusion_count> excluded{}; ///< by cause, in the order of `exclusion`
    std::uint64_t live = 0;                                ///< live traffic: nobody knows what was sent
    std::uint64_t decoded = 0;                             ///< known only by decoding, so tallied elsewhere
    std::vector<std::uint64_t> sent;                       ///< judged symbols by index sent
    std::vector<std::uint64_t> by_bit;                     ///< bit errors by position, [0] the leftmost
    transition_counts transitions;                         ///< errors only

    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("symbols", symbols);
        a("symbol_errors", symbol_errors);
        a("bits", bits);
        a("bit_errors", bit_errors);
        a("bit_errors_squared", bit_errors_squared);
        a("nonfinite", nonfinite);
        a("excluded", excluded);
        a("live", live);
        a("decoded", decoded);
        a("sent", sent);
        a("by_bit", by_bit);
        a("transitions", transitions);
    }

    /// symbols + nonfinite + live + decoded + Σ excluded: every symbol that was ever handed in.
    std::uint64_t accounted() const;
    /// Σh²/Σh, how bit errors clump within symbols; 1 with no errors.
    double bit_dispersion() const;

private:
    std::vector<label_t> d_labels;
    unsigned d_label_bits;
};

} // namespace halfplane
