// SPDX-License-Identifier: GPL-3.0-or-later
// detect: exact nearest-point and MAP decisions at a cost that does not grow with the number of points.
#pragma once

#include "halfplane/signal_set.h"

#include <complex>
#include <cstddef>
#include <cstdint>
#include <memory>

namespace halfplane::kernels {

/*!
 * Decides which point was sent. The decision is that of brute force in double precision,
 * argmax_i Re(r·s_i*) − |s_i|²/2 + (N0/2)·ln p_i, the lower index on ties; for samples inside and far outside
 * the set. NaN or Inf in a sample yields `nonfinite`.
 */
class point_decider
{
public:
    static constexpr std::uint16_t nonfinite = 0xffff;

    /// Nearest point (ML). The set is copied.
    explicit point_decider(const signal_set& set);
    /// MAP at noise density n0 (> 0, finite, in the square of the points' unit). \throws
    /// std::invalid_argument
    point_decider(const signal_set& set, double n0);
    ~point_decider();
    point_decider(point_decider&&) noexcept;
    point_decider& operator=(point_decider&&) noexcept;

    /// `count` samples in, `count` indices out (0 … M−1, or `nonfinite`). Thread-safe.
    void decide(const std::complex<float>* in, std::uint16_t* out, std::size_t count) const;
    /// The readable reference: all points, double precision.
    void decide_reference(const std::complex<float>* in, std::uint16_t* out, std::size_t count) const;

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::kernels
