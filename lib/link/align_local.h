// SPDX-License-Identifier: GPL-3.0-or-later
// align_local: after a doubt, is the pattern back at its delay, or a few symbols beside it?
#pragma once

#include "align_types.h"

#include <array>
#include <deque>
#include <optional>

namespace halfplane::link {

/*!
 * Correlates corrected samples with the reference at its old place and up to `widest` symbols to either side:
 * most slips are short, and a gap that was none shows at once.
 */
class local_search
{
public:
    static constexpr int widest = 64;
    static constexpr std::size_t block = 256;

    struct answer {
        int shift;     ///< symbols by which the pattern now runs ahead of the old alignment; 0: it is back
        complex ratio; ///< gain against what the samples were corrected by
        double coefficient;  ///< correlation coefficient, 0 … 1
        std::size_t symbols; ///< that spoke for it, the newest ones
    };

    explicit local_search(reference& ref) : d_ref(ref) {}
    void restart(std::uint64_t from, double usual_coefficient);
    /// `y`: samples corrected under `a`, known up to `end`.
    std::optional<answer> look(const ring<sample>& y, const alignment& a, std::uint64_t end);

private:
    struct part {
        std::array<complex, 2 * widest + 1> cross;
        double received;
    };
    void add_block(const ring<sample>& y, const alignment& a);
    std::optional<answer> best() const;

    reference& d_ref;
    std::uint64_t d_next = 0;
    double d_usual = 1;
    std::deque<part> d_parts;
};

} // namespace halfplane::link
