// SPDX-License-Identifier: GPL-3.0-or-later
// second_counts: errored and severely errored seconds, and the availability that decides which of them count.
#pragma once

#include <cstdint>

namespace halfplane {

/// What happened in one second of a link.
struct second {
    std::uint64_t bits = 0, bit_errors = 0; ///< judged
    bool lost = false;                      ///< lock or signal was lost within it
    bool damaged = false;                   ///< symbols with a known reference came as no numbers
    bool unmeasured = false; ///< nothing can be said: before the first lock, or every sample missing
};

/*!
 * Counts by analogy with ITU-T G.821: a second with a bit error (or damage) is errored; one with a BER of at
 * least 1e-3, or a loss of lock, is severely errored as well. Ten severely errored seconds in a row begin
 * unavailable time, and those ten belong to it; ten seconds in a row that are not severely errored end it,
 * and those ten are available again. Only available time counts, so what was counted is taken back when a
 * second turns out to have been unavailable, and made up for the other way. Unmeasured seconds are listed
 * apart; they neither lengthen nor break a row of ten.
 */
class second_counts
{
public:
    static constexpr std::uint64_t severe_share = 1000; ///< severe: one bit error in so many bits, or more
    static constexpr unsigned row = 10;

    void add(const second& s);

    std::uint64_t errored() const noexcept { return d_errored; }
    std::uint64_t severely_errored() const noexcept { return d_severe; }
    std::uint64_t available() const noexcept { return d_available; }
    std::uint64_t unavailable() const noexcept { return d_unavailable; }
    std::uint64_t unmeasured() const noexcept { return d_unmeasured; }
    /// Every second that was added.
    std::uint64_t all() const noexcept { return d_available + d_unavailable + d_unmeasured; }

    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("errored", d_errored);
        a("severe", d_severe);
        a("available", d_available);
        a("unavailable", d_unavailable);
        a("unmeasured", d_unmeasured);
        a("is_available", d_is_available);
        a("turning", d_turning);
        a("turning_errored", d_turning_errored);
    }

private:
    std::uint64_t d_errored = 0, d_severe = 0, d_available = 0, d_unavailable = 0, d_unmeasured = 0;
    bool d_is_available = true;
    unsigned d_turning = 0;         // seconds in a row that speak for the other state
    unsigned d_turning_errored = 0; // of these, errored
};

} // namespace halfplane
