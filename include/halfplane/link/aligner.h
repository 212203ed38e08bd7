// SPDX-License-Identifier: GPL-3.0-or-later
// aligner: finds the pattern in one sample a symbol, corrects causally, and says of each symbol what was sent
// or why it is left out.
#pragma once

#include "halfplane/pattern.h"
#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"

#include <complex>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <vector>

namespace halfplane::link {

enum class lock_state { searching, held, doubtful, lost };
const char* to_string(lock_state s) noexcept;

/// What is locked to. Angles in degrees, frequency in cycles a symbol.
struct lock_status {
    lock_state state = lock_state::searching;
    std::uint64_t delay = 0; ///< pattern position of the first symbol ever put in, modulo the period
    double rotation_deg = 0; ///< of the set's own rotations the one nearest to the phase at lock, 0 … < 360
    bool mirrored = false;   ///< spectrum inverted: samples are conjugated before anything else
    bool inverted = false;   ///< bits inverted (never where a rotation says the same)
    double frequency = 0;    ///< residual frequency of the received samples at lock
    std::uint64_t slips = 0; ///< so far
};

/// A change of lock, at the output symbol with which it takes effect.
struct lock_event {
    std::uint64_t symbol;
    lock_status status;
};

enum class correction { running, held, off };

struct aligner_options {
    correction mode = correction::running;
    std::size_t memory = 2000; ///< symbols of the running estimate, ≥ 16
    std::uint64_t seed = 1;    ///< nothing random is visible; kept for ties in the search
};

/*!
 * One sample in, one sample out, `holdback` symbols later: out sample, and the index sent or a negative
 * exclusion code. Never more than the past is used to correct a sample.
 */
class aligner
{
public:
    static constexpr std::size_t holdback = 4096;

    aligner(const signal_set& set, const pattern& known, aligner_options options = {});
    ~aligner();
    aligner(aligner&&) noexcept;

    /*!
     * Takes `count` samples, writes the symbols that leave the hold-back.
     * \param out, reference room for `count` each
     * \returns how many were written; the total written is max(0, total taken − holdback)
     */
    std::size_t process(const std::complex<float>* in,
                        std::size_t count,
                        std::complex<float>* out,
                        reference_t* reference);
    /// End of a recording: empties the hold-back. Room for `holdback` symbols.
    std::size_t finish(std::complex<float>* out, reference_t* reference);
    /// Samples are missing before the next input sample (radio overflow).
    void mark_overflow();

    /// Changes of lock since the last call, in order.
    std::vector<lock_event> take_events();
    const lock_status& status() const noexcept;
    std::uint64_t taken() const noexcept;   ///< samples in so far
    std::uint64_t written() const noexcept; ///< symbols out so far

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::link
