// SPDX-License-Identifier: GPL-3.0-or-later
// align_fit: gain, phase and frequency of a stretch whose symbols are supposed known, and whether to believe
// it.
#pragma once

#include "align_types.h"

#include "halfplane/kernels/detect.h"

#include <optional>

namespace halfplane::link {

/*!
 * Sums of one stretch short against 1/frequency. The means are taken out: neither an unmodulated carrier nor
 * an offset then correlates with a set whose points do not sum to nothing.
 */
struct moments {
    double n = 0, rr = 0, ss = 0; ///< count, Σ|r|², Σ|s|²
    complex rs{}, r{}, s{};       ///< Σ r·s*, Σr, Σs

    complex cross() const noexcept { return n > 0 ? rs - r * std::conj(s) / n : complex{}; }
    double sent() const noexcept { return n > 0 ? ss - std::norm(s) / n : 0; }
    double received() const noexcept { return n > 0 ? rr - std::norm(r) / n : 0; }

    /// Adds the samples that are usable.
    void add(const sample* r, const std::uint16_t* sent, const sample* points, std::size_t count);
    moments& operator+=(const moments& o) noexcept;
};

struct fit {
    complex gain;            ///< r = gain·s·e^{2πj·frequency·(k − end)}, mirror undone
    complex standing_gain;   ///< the same with frequency taken as zero
    double frequency = 0;    ///< cycles a symbol
    double frequency_sd = 0; ///< by the bound of Rife and Boorstyn, IEEE Trans. IT 20 (1974) 591
    double coefficient = 0;  ///< |correlation coefficient| of samples and symbols, 0 … 1
    std::size_t symbols = 0;
    std::uint64_t end = 0; ///< one past the last symbol
};

/// Least squares over symbols begin … end − 1 under an alignment, |frequency| ≤ 2e-4, without what stands at
/// their beginning and is not like their second half (a receiver that starts); nothing where the samples are
/// empty.
std::optional<fit> fit_stretch(
    reference& ref, const ring<sample>& raw, const alignment& a, std::uint64_t begin, std::uint64_t end);

/*!
 * How many standard deviations the agreement of decisions and reference lies above what decisions of these
 * frequencies agree by chance. A constant, a carrier, an idle code score near 0 whatever the reference.
 */
double agreement(reference& ref,
                 const kernels::point_decider& decider,
                 const ring<sample>& raw,
                 const alignment& a,
                 const fit& f,
                 std::uint64_t begin,
                 std::uint64_t end);

/// A gain that turns steadily and is not learnt from what it corrects.
struct turning_gain {
    complex gain{1, 0};
    double frequency = 0; ///< cycles a symbol
    std::uint64_t at = 0; ///< the symbol of which `gain` speaks

    /// out[k] = r[k]/gain as of symbol first + k.
    void undo(const sample* r, std::uint64_t first, std::size_t count, sample* out) const;
};

/// Samples begin … end − 1, mirror undone.
void fetch(const ring<sample>& raw, bool mirrored, std::uint64_t begin, std::uint64_t end, sample* out);

} // namespace halfplane::link
