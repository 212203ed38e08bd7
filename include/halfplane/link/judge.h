// SPDX-License-Identifier: GPL-3.0-or-later
// judge: a recording through the very objects of the live link, as fast as they go.
#pragma once

#include "halfplane/link/aligner.h"
#include "halfplane/link/recording.h"
#include "halfplane/link/watch.h"
#include "halfplane/pattern.h"

#include <cstdint>
#include <functional>
#include <optional>

namespace halfplane::link {

struct judge_options {
    /// As for a live link, but that a symbol rate of 0 is that of the recording, and that the clock is the
    /// recording's.
    watch_options watch;
    aligner_options align;
    std::optional<input_snr> input; ///< Es/N0 ahead of the receiver, where it is known
    /// Told how many samples were read, ten times a second at most; false ends the run early.
    std::function<bool(std::uint64_t)> progress;
    /// Given each report in order, and what watch::settings() says, on a thread of its own. What it throws
    /// ends the run.
    std::function<void(const report&, const nlohmann::json& settings)> on_report;
};

struct judgement {
    report last;             ///< the final report: all that was read
    nlohmann::json settings; ///< as watch::settings()
    bool complete = true;    ///< false: ended early by `progress`
};

/*!
 * Judges what is left of a recording with one sample a symbol. What the aligner holds back is judged at the
 * end, so that a recording of any length is. Before a capture with a gap an overflow is marked. Unlike live,
 * no windows are ever merged: the same recording and options give the same reports.
 * \throws std::invalid_argument as watch and aligner do; std::runtime_error as recording::read() does
 */
judgement judge(recording& from, const signal_set& set, const pattern& known, judge_options options);

/// A window for a recording of so many samples: fifty reports at most, since each costs a prediction; 10,000
/// symbols at least.
std::uint64_t window_for(std::uint64_t samples) noexcept;

} // namespace halfplane::link
