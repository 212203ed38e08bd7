// SPDX-License-Identifier: GPL-3.0-or-later
// recent_samples: the latest few samples of a window, for a picture; nothing is counted or gauged from them.
#pragma once

#include "halfplane/symbol_code.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <cstddef>
#include <iterator>
#include <vector>

namespace halfplane::link {

/*!
 * Finite samples whose symbol is judged or live traffic, as they came in, the oldest first; at most 256. What
 * is left out for a cause (no lock, no signal) would show a link that is not there.
 */
class recent_samples
{
public:
    static constexpr std::size_t most = 256;

    /// Samples with a reference each; looks at the latest only, so that the cost does not grow with n.
    void add(const std::complex<float>* in, const reference_t* reference, std::size_t n)
    {
        std::complex<float> found[most];
        std::size_t first = most; // filled from the end
        const std::size_t looked = std::min(n, 2 * most);
        for (std::size_t k = n; k-- > n - looked && first > 0;)
            if ((reference[k] >= 0 || reference[k] == live_code) && std::isfinite(in[k].real()) &&
                std::isfinite(in[k].imag()))
                found[--first] = in[k];
        append(found + first, found + most);
    }

    /// What came after these.
    void merge(const recent_samples& later) { append(later.d_samples.begin(), later.d_samples.end()); }

    const std::vector<std::complex<float>>& samples() const noexcept { return d_samples; }

private:
    template <typename Iterator>
    void append(Iterator first, Iterator last)
    {
        const auto added = static_cast<std::size_t>(std::distance(first, last)); // ≤ most
        const auto kept = std::min(d_samples.size(), most - added);
        d_samples.erase(d_samples.begin(), d_samples.end() - static_cast<std::ptrdiff_t>(kept));
        d_samples.insert(d_samples.end(), first, last);
    }

    std::vector<std::complex<float>> d_samples;
};

} // namespace halfplane::link
