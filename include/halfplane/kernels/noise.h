// SPDX-License-Identifier: GPL-3.0-or-later
// noise: seeded complex Gaussian noise by counter, the same numbers whatever thread or instruction set draws
// them.
#pragma once

#include <complex>
#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {

/*!
 * CN(0, n0) samples: sample k of (seed, stream) is a pure function of the three, so any stretch can be drawn
 * anywhere, and every machine draws the same floats.
 *
 * Construction: Philox4x32-10 (Salmon et al., SC11) keyed by the seed, its counter holding stream and k/2;
 * each block of four words serves two samples. Box and Muller (Ann. Math. Stat. 29 (1958) 610): radius
 * √(−n0·ln u), angle 2πv, v of 32 bits. u has 32 bits, and 64 wherever the first twelve are zero: so u
 * reaches down to 2^-65, a radius of 9.5 standard deviations of one dimension, and it never moves in steps
 * above 2^-20 of itself before 2^-44, nor above 2^-11 before 2^-53, which is where a radius of 8.5 lies. k <
 * 2^63, streams < 2^64.
 */
class complex_noise
{
public:
    static constexpr double relative_accuracy =
        4e-7; ///< of each sample, against the same construction in long double

    explicit complex_noise(std::uint64_t seed, std::uint64_t stream = 0);
    /// Writes samples first … first + count − 1, each of variance n0 (≥ 0, finite), n0/2 a real dimension.
    /// \throws std::invalid_argument where n0 is negative or not finite
    void draw(std::uint64_t first, std::size_t count, double n0, std::complex<float>* out) const;
    /// The same, added to what stands in `out`.
    void add(std::uint64_t first, std::size_t count, double n0, std::complex<float>* out) const;
    /// The readable reference: one sample, unit n0, in double.
    std::complex<double> reference(std::uint64_t k) const;

private:
    std::uint64_t d_seed, d_stream;
};

} // namespace halfplane::kernels
