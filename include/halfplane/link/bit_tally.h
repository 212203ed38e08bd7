// SPDX-License-Identifier: GPL-3.0-or-later
// bit_tally: errors behind any decoder: two streams of bits that should be equal, counted and judged.
#pragma once

#include "halfplane/block_counts.h"
#include "halfplane/error_target.h"
#include "halfplane/frame_counts.h"
#include "halfplane/link/watch.h"
#include "halfplane/verdict.h"

#include <cstddef>
#include <cstdint>
#include <functional>
#include <optional>
#include <string>

namespace halfplane::link {

struct bit_tally_options {
    bool packed = false;            ///< eight bits a byte, the most significant first; else one a byte
    std::uint64_t frame_bits = 0;   ///< 0: no frames
    std::string target;             ///< "ber:1e-5" or "fer:1e-2"; empty: no verdict
    double confidence = 0.95;       ///< of intervals and verdict, in (0, 1)
    double max_excluded = 1e-3;     ///< share of bits (frames) left out beyond which nothing passes
    std::uint64_t dependence = 256; ///< bits over which errors may hang together unseen; see verdict_options
    std::function<std::string()> clock; ///< UTC, RFC 3339; the system's clock where empty
};

/*!
 * The account is `in = judged + excluded.delay + excluded.no_bit`, in bits of the received stream. `no_bit`:
 * an unpacked byte of either stream that is neither 0 nor 1. Errors behind a decoder come in bursts, so that
 * intervals are widened by the dispersion of their counts over blocks of 64 bits and more.
 */
class bit_tally
{
public:
    /// \throws std::invalid_argument naming the option and its value
    explicit bit_tally(bit_tally_options options);

    void add(const std::uint8_t* sent, const std::uint8_t* received, std::size_t bytes);
    /// Received bytes that have no counterpart: those of the delay.
    void skip(std::size_t bytes);

    std::uint64_t bits() const noexcept { return d_total.bits; }
    std::uint64_t bits_in_window() const noexcept { return d_total.bits - d_before.bits; }
    /// Closes the window. The fields are those of a link's report that speak of bits and frames: `window`
    /// with `first_bit`, `total`, `verdict`.
    report make_report(bool final = false);
    nlohmann::json settings() const;

private:
    struct counts {
        std::uint64_t bits = 0, bit_errors = 0, delay = 0, no_bit = 0;
        frame_counts frames;
    };
    void add_bit(bool wrong);
    void add_clear(std::uint64_t bits);
    void leave_out();
    void take_frames(std::uint64_t count, bool in_error);
    report part(const counts& since) const;

    const bit_tally_options d_options;
    std::string d_digest;
    std::optional<error_target> d_target;
    std::optional<verdict> d_bets;
    counts d_total, d_before; ///< of the run, and as it was when the window began
    block_counts d_blocks, d_frame_blocks;
    std::uint64_t d_sequence = 0;
};

} // namespace halfplane::link
