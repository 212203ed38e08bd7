// SPDX-License-Identifier: GPL-3.0-or-later
// second_clock: cuts a stream of counted symbols into seconds by its symbol rate.
#pragma once

#include "halfplane/second_counts.h"
#include "halfplane/tally.h"

#include <array>
#include <cmath>
#include <cstdint>
#include <limits>

namespace halfplane::link {

/*!
 * Second k ends after ⌊(k + 1)·rate⌋ symbols handed in, judged or not. A second in which symbols were
 * excluded as slip or signal lost is a lost one; one that holds symbols from before the lock, or none that
 * was judged though nothing was lost, is unmeasured.
 */
class second_clock
{
public:
    /// No seconds where the rate is below one symbol a second or unknown (0).
    explicit second_clock(double symbol_rate) : d_rate(symbol_rate >= 1 ? symbol_rate : 0) {}

    /// How many symbols the second under way still takes, ≥ 1.
    std::uint64_t left() const
    {
        return d_rate > 0 ? d_end - d_handed : std::numeric_limits<std::uint64_t>::max();
    }

    /// The part of a tally that seconds are made of.
    struct mark {
        explicit mark(const tally& t)
            : bits(t.bits), bit_errors(t.bit_errors), nonfinite(t.nonfinite), excluded(t.excluded)
        {
        }
        std::uint64_t bits, bit_errors, nonfinite;
        std::array<std::uint64_t, exclusion_count> excluded;
    };

    /// `n` symbols, at most left(), that took a tally from one mark to the other.
    void add(const mark& before, const mark& after, std::uint64_t n)
    {
        if (d_rate == 0)
            return;
        const auto excluded = [&](exclusion cause) {
            const auto k = static_cast<std::size_t>(-1 - static_cast<int>(cause));
            return after.excluded[k] > before.excluded[k];
        };
        d_open.bits += after.bits - before.bits;
        d_open.bit_errors += after.bit_errors - before.bit_errors;
        d_open.damaged |= after.nonfinite > before.nonfinite;
        d_open.lost |= excluded(exclusion::slip) || excluded(exclusion::signal_lost);
        d_open.unmeasured |= excluded(exclusion::before_lock);
        d_handed += n;
        if (d_handed < d_end)
            return;
        d_open.unmeasured |= d_open.bits == 0 && !d_open.lost && !d_open.damaged;
        d_counts.add(d_open);
        d_open = {};
        d_end = end_of(++d_second);
    }

    /// Those of an earlier run count as well; its last second, cut short, does not.
    void go_on(const second_counts& from) { d_counts = from; }

    /// Of the seconds that are over.
    const second_counts& counts() const noexcept { return d_counts; }

private:
    std::uint64_t end_of(std::uint64_t k) const
    {
        return static_cast<std::uint64_t>(std::floor(static_cast<double>(k + 1) * d_rate));
    }

    double d_rate;
    second_counts d_counts;
    second d_open;
    std::uint64_t d_second = 0, d_handed = 0, d_end = d_rate > 0 ? end_of(0) : 0;
};

} // namespace halfplane::link
