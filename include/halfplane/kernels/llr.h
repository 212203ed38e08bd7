// SPDX-License-Identifier: GPL-3.0-or-later
// llr: log-likelihood ratios of the label bits, exact or max-log, for any labels and priors.
#pragma once

#include "halfplane/signal_set.h"

#include <complex>
#include <cstddef>
#include <cstdint>
#include <memory>

namespace halfplane::kernels {

/// Which bit value a positive ratio speaks for.
enum class llr_sign { positive_is_0, positive_is_1 };
/// exact: all points; max_log: the likeliest point of each bit value only.
enum class llr_rule { exact, max_log };

struct llr_options {
    llr_rule rule = llr_rule::exact;
    llr_sign sign = llr_sign::positive_is_0;
    /// Ratios are clipped to ± this; in (0, 1e6].
    float saturation = 1e6f;
};

/*!
 * For bit k of the label, leftmost first, in nats, of the a-posteriori probabilities (priors included):
 *
 *     L_k = ln Σ_{i: bit k of label i is 0} p_i·exp(−|r − s_i|²/N0)  −  ln Σ_{i: bit k is 1} p_i·exp(−|r −
 * s_i|²/N0)
 *
 * **A positive L_k speaks for bit 0**, unless the options ask for `positive_is_1`, which flips every sign.
 * Max-log takes the largest term in place of each sum. Where no label has one of the two values, L_k is ±
 * saturation. A sample that is not finite says nothing: its ratios are 0.
 *
 * Metrics are differenced in double precision before anything becomes a float; sums that would underflow are
 * done again around their own largest term.
 */
class llr_decider
{
public:
    /// Largest error of a ratio, absolute or relative, whichever is larger, from −10 to 40 dB Es/N0.
    static constexpr double accuracy = 1e-5;

    /// \param n0 noise density, > 0, finite, in the square of the points' unit
    /// \throws std::invalid_argument naming the value that is refused
    llr_decider(const signal_set& set, double n0, llr_options options = {});
    ~llr_decider();
    llr_decider(llr_decider&&) noexcept;
    llr_decider& operator=(llr_decider&&) noexcept;

    /// Another noise density, O(M). Not while decide() runs. \throws std::invalid_argument
    void set_n0(double n0);
    double n0() const noexcept;
    /// Ratios a sample.
    unsigned label_bits() const noexcept;

    /// `count` samples in, count·label_bits() ratios out. Thread-safe.
    void decide(const std::complex<float>* in, float* out, std::size_t count) const;
    /// The readable reference: double precision, the formula above as it stands around its largest term.
    void decide_reference(const std::complex<float>* in, double* out, std::size_t count) const;

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::kernels
