// SPDX-License-Identifier: GPL-3.0-or-later
// frame_counts: frames in error, on a grid that begins with the first judged step.
#pragma once

#include <algorithm>
#include <array>
#include <cstddef>
#include <cstdint>
#include <numeric>

namespace halfplane {

/*!
 * Cuts a stream of steps (symbols, or bits) into frames of equal length. The first frame begins with the
 * first step that is judged; from there on the grid runs through all steps, judged or not, so that
 *
 *     frames + Σ excluded = ⌊steps since then / length⌋      exactly.
 *
 * A frame counts only where all its steps are judged: it is in error if one of them is. Any other is
 * excluded, by the cause of its first step that is not judged. Where frames really begin in the user's
 * pattern does not matter to the rate: a slip moves the grid against them and costs the frame it falls into.
 *
 * Each call tells `on_frames(count, in_error)` of the judged frames it completed, in order.
 */
class frame_counts
{
public:
    static constexpr std::size_t causes = 6;

    /// \param length steps of a frame; 0: no frames are counted
    explicit frame_counts(std::uint64_t length = 0) : d_length(length) {}

    std::uint64_t frames = 0, frame_errors = 0;
    std::array<std::uint64_t, causes> excluded{};

    std::uint64_t length() const noexcept { return d_length; }
    std::uint64_t all_excluded() const
    {
        return std::accumulate(excluded.begin(), excluded.end(), std::uint64_t{0});
    }

    /// `steps` judged steps without an error, any number.
    template <typename OnFrames>
    void add_clear(std::uint64_t steps, OnFrames&& on_frames)
    {
        advance(
            steps,
            [&](std::uint64_t whole) {
                frames += whole;
                on_frames(whole, false);
            },
            on_frames);
    }
    /// One judged step in error.
    template <typename OnFrames>
    void add_error(OnFrames&& on_frames)
    {
        d_wrong = true;
        add_clear(1, on_frames);
    }
    /// `steps` that are not judged; nothing before the first that is.
    template <typename OnFrames>
    void leave_out(std::uint64_t steps, std::size_t cause, OnFrames&& on_frames)
    {
        if (!d_begun || steps == 0)
            return;
        if (d_cause == none)
            d_cause = cause;
        advance(
            steps, [&](std::uint64_t whole) { excluded[cause] += whole; }, on_frames);
        if (d_position > 0 && d_cause == none)
            d_cause = cause;
    }

    /// Forgets the frame under way: what follows is another stream, and its grid begins anew.
    void restart()
    {
        d_position = 0;
        d_begun = d_wrong = false;
        d_cause = none;
    }
    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("frames", frames);
        a("frame_errors", frame_errors);
        a("excluded", excluded);
        a("position", d_position);
        a("begun", d_begun);
        a("wrong", d_wrong);
        a("cause", d_cause);
    }

private:
    static constexpr std::size_t none = causes;

    template <typename Whole, typename OnFrames>
    void advance(std::uint64_t steps, Whole&& whole_frames, OnFrames&& on_frames)
    {
        if (d_length == 0 || steps == 0)
            return;
        d_begun = true;
        const auto first = std::min(steps, d_length - d_position);
        d_position += first;
        steps -= first;
        if (d_position == d_length) {
            if (d_cause != none) {
                ++excluded[d_cause];
            } else {
                ++frames;
                frame_errors += d_wrong;
                on_frames(std::uint64_t{1}, d_wrong);
            }
            d_position = 0;
            d_wrong = false;
            d_cause = none;
        }
        if (const auto whole = steps / d_length; whole > 0)
            whole_frames(whole);
        d_position += steps % d_length;
    }

    std::uint64_t d_length, d_position = 0; ///< steps of the frame under way
    bool d_begun = false, d_wrong = false;
    std::size_t d_cause = none;
};

} // namespace halfplane
