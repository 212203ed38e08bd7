// SPDX-License-Identifier: GPL-3.0-or-later
// trial: frames of a run of symbols, and the verdict on its target.
#pragma once

#include "halfplane/block_counts.h"
#include "halfplane/error_target.h"
#include "halfplane/frame_counts.h"
#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"
#include "halfplane/verdict.h"

#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <utility>
#include <vector>

namespace halfplane::link {

struct trial_options {
    std::string target;              ///< "ser:1e-3", "ber:1e-5", "fer:1e-2"; empty: no verdict
    std::uint64_t frame_symbols = 0; ///< symbols of a frame; 0: no frames
    double max_excluded =
        1e-3; ///< share of excluded symbols (frames, for a target on frames) beyond which nothing passes
    /// Steps over which errors may hang together unseen; see verdict_options. 0: 256 bits' worth of symbols,
    /// one frame.
    std::uint64_t dependence = 0;
};

/// Where a run stands. A copy is a snapshot.
struct trial_state {
    frame_counts frames;
    block_counts frame_blocks; ///< whether frame errors cluster
    std::optional<error_target> target;
    std::optional<verdict> bets;

    /// What restore() takes.
    nlohmann::json save() const;
    /// Goes on with another run's. The frame under way there is given up. \throws std::invalid_argument
    void restore(const nlohmann::json& saved);
};

/*!
 * A step of the bets is a symbol; of a target on frames a judged frame. Symbols that are left out are no
 * steps. The causes of excluded frames are those of the symbols, in the order of `exclusion`, nonfinite,
 * and last those that hold symbols not known in advance.
 */
class trial
{
public:
    static constexpr std::size_t nonfinite = exclusion_count, live = exclusion_count + 1;

    /// \throws std::invalid_argument naming the option and its value
    trial(const signal_set& set, const trial_options& options, double confidence);

    /// `n` judged symbols in order, as indices.
    void judged(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t n);
    /// `n` symbols that are not judged.
    void left_out(std::size_t cause, std::uint64_t n = 1);
    const trial_state& state() const noexcept { return d; }
    /// From where another run stood.
    void go_on(trial_state from) { d = std::move(from); }

private:
    void take_frames(std::uint64_t count, bool in_error);

    std::vector<label_t> d_labels;
    bool d_idle;
    trial_state d;
};

} // namespace halfplane::link
