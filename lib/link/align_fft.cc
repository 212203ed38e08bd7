// SPDX-License-Identifier: GPL-3.0-or-later
// align_fft: Stockham steps whose inner loop runs over neighbours, so that the compiler vectorises it.
#include "align_fft.h"

#include <algorithm>
#include <cmath>

namespace halfplane::link {

fft::fft(std::size_t size) : d_size(size), d_twiddle(size / 2), d_scratch(size)
{
    for (std::size_t k = 0; k < size / 2; ++k)
        d_twiddle[k] = std::complex<float>(
            std::polar(1.0, -2 * M_PI * static_cast<double>(k) / static_cast<double>(size)));
}

void fft::transform(std::complex<float>* data)
{
    std::complex<float>* from = data;
    std::complex<float>* to = d_scratch.data();
    for (std::size_t half = d_size / 2, run = 1; half >= 1; half /= 2, run *= 2) {
        for (std::size_t j = 0; j < half; ++j) {
            const float wr = d_twiddle[j * run].real(), wi = d_twiddle[j * run].imag();
            const auto* a = reinterpret_cast<const float*>(from + j * run);
            const auto* b = reinterpret_cast<const float*>(from + (j + half) * run);
            auto* sum = reinterpret_cast<float*>(to + 2 * j * run);
            auto* turned = sum + 2 * run;
            for (std::size_t k = 0; k < 2 * run; k += 2) {
                const float re = a[k] - b[k], im = a[k + 1] - b[k + 1];
                sum[k] = a[k] + b[k];
                sum[k + 1] = a[k + 1] + b[k + 1];
                turned[k] = re * wr - im * wi;
                turned[k + 1] = re * wi + im * wr;
            }
        }
        std::swap(from, to);
    }
    if (from != data)
        std::copy_n(from, d_size, data);
}

} // namespace halfplane::link
