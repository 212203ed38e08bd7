// SPDX-License-Identifier: GPL-3.0-or-later
// noise: seeded complex Gaussian noise by counter, the same numbers whatever thread draws them.
#pragma once

#include <complex>
#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

/*!
 * CN(0, n0) samples: sample k of (seed, stream) is a pure function of the three, so any stretch can be drawn anywhere.
 */
class complex_noise
{
public:
    explicit complex_noise(std::uint64_t seed, std::uint64_t stream = 0);
    /// Writes samples first … first + count − 1, each of variance n0 (≥ 0), n0/2 a real dimension.
    void draw(std::uint64_t first, std::size_t count, double n0, std::complex<float>* out) const;
    /// The same, added to what stands in `out`.
    void add(std::uint64_t first, std::size_t count, double n0, std::complex<float>* out) const;

private:
    std::uint64_t d_seed, d_stream;
};

} // namespace halfplane::kernels
