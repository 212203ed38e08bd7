// SPDX-License-Identifier: GPL-3.0-or-later
// align_search: finding the pattern in samples of unknown gain, phase, frequency, mirror and polarity.
#pragma once

#include "align_types.h"

#include "halfplane/kernels/detect.h"

#include <memory>
#include <optional>

namespace halfplane::link {

/// The best hypothesis of a search, not yet verified, and the symbols that spoke for it.
struct finding {
    alignment where;
    std::uint64_t begin, end;
};

/*!
 * Looks at a stream as it arrives, every so many symbols, so that its cost a symbol stays bounded. Findings
 * are the best of all hypotheses (delays × mirror × polarity; rotations come with the phase), never the first
 * that passes.
 */
class search
{
public:
    virtual ~search() = default;
    /// Forgets everything; the stream to search begins with symbol `from`.
    virtual void restart(std::uint64_t from) = 0;
    /// To be called at least every 2,048 symbols. `end`: one past the newest symbol.
    virtual std::optional<finding> look(const ring<sample>& raw, std::uint64_t end) = 0;

    /// Symbols that a search may look back on.
    static constexpr std::size_t longest_look = 16384;
};

/// Correlation with the whole known period. Any table pattern.
std::unique_ptr<search> make_correlation_search(reference& ref);

/// Long shift registers: blind phase, decisions, three-term parity checks, confirmation against the sequence.
std::unique_ptr<search> make_parity_search(reference& ref, const kernels::point_decider& decider);

} // namespace halfplane::link
