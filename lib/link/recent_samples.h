// SPDX-License-Identifier: GPL-3.0-or-later
// recent_samples: a few of the samples that came last, for the eye.
#pragma once

#include "halfplane/symbol_code.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace halfplane::link {

/// At most `capacity` finite samples that were judged, decoded or live: 64 of each chunk, evenly spaced, of
/// the last four.
class recent_samples
{
public:
    static constexpr std::size_t capacity = 256, of_chunk = 64;

    /// \param reference symbol_code.h; what was excluded is not shown. n > 0
    void add(const std::complex<float>* in, const std::int16_t* reference, std::size_t n)
    {
        const std::size_t step = std::max<std::size_t>(1, n / of_chunk);
        for (std::size_t k = 0; k < n; k += step) {
            const bool excluded = reference[k] < 0 && reference[k] != live_code;
            if (excluded || !std::isfinite(in[k].real()) || !std::isfinite(in[k].imag()))
                continue;
            if (d_kept.size() < capacity)
                d_kept.push_back(in[k]);
            else
                d_kept[d_next] = in[k];
            d_next = (d_next + 1) % capacity;
        }
    }
    const std::vector<std::complex<float>>& kept() const { return d_kept; }

private:
    std::vector<std::complex<float>> d_kept;
    std::size_t d_next = 0;
};

} // namespace halfplane::link
