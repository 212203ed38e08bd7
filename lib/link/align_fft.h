// SPDX-License-Identifier: GPL-3.0-or-later
// align_fft: a small complex Fourier transform, so that the link library needs no other.
#pragma once

#include <complex>
#include <cstddef>
#include <vector>

namespace halfplane::link {

/*!
 * Forward transform of a fixed power-of-two length, X_k = Σ x_n e^{−2πjkn/N}, by Stockham's self-sorting
 * radix-2 steps (Van Loan, Computational Frameworks for the FFT, 1992, section 1.7). The inverse needed for
 * correlation follows by conjugation and is left to the caller, who mostly wants magnitudes.
 */
class fft
{
public:
    explicit fft(std::size_t size);
    std::size_t size() const noexcept { return d_size; }
    /// In place. One thread at a time: works in scratch memory of its own.
    void transform(std::complex<float>* data);

private:
    std::size_t d_size;
    std::vector<std::complex<float>> d_twiddle, d_scratch;
};

} // namespace halfplane::link
