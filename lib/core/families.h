// SPDX-License-Identifier: GPL-3.0-or-later
// families: the named constellations of our own, made by rule; tables in the tests freeze them.
#pragma once

#include "halfplane/signal_set.h"

#include <string>
#include <vector>

namespace halfplane::detail {

/// M points of radius 1, index k at the angle 2πk/M; Gray labels for even M, one neighbouring pair two bits
/// apart for odd M.
signal_set psk(std::size_t size);

/// Odd integers, rows from the lower left; M a power of two, twice as many columns as rows where it is no
/// square; Gray labels, the column's bits first.
signal_set qam(std::size_t size);

/// Odd integers, a square without its corners, rows from the lower left; M = 32, 128, 512, 2048; labels
/// searched.
signal_set cross(std::size_t size);

/// M points of the hexagonal lattice with d_min 2 around a lattice point, a triangle's centre or an edge's
/// middle, whichever takes the least energy; the mean moved to 0; natural labels.
signal_set hex(std::size_t size);

/*!
 * Rings from the inside, counter-clockwise, natural labels. Ring r has counts[r] points, the first at `first`
 * steps of that ring from the positive real axis (½ or 0). The innermost has radius 1, the following ones
 * ratios[r−1]; a first ring of one point stands at 0 and the next one has radius 1.
 */
enum class ring_start { on_axis, half_step };
signal_set rings(const std::vector<std::size_t>& counts, const std::vector<double>& ratios, ring_start start);

/// Bits that tell M points apart, ⌈log2 M⌉, at least 1.
unsigned bits_for(std::size_t size) noexcept;
/// Reflected binary code: neighbouring ranks differ in one bit.
inline unsigned gray(unsigned rank) noexcept
{
    return rank ^ rank >> 1;
}
/// Rank of a reflected binary code word.
unsigned gray_rank(unsigned word) noexcept;

} // namespace halfplane::detail
