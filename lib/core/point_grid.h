// SPDX-License-Identifier: GPL-3.0-or-later
// point_grid: points sorted into square buckets, visited ring by ring around one of them.
#pragma once

#include "halfplane/signal_set.h"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <vector>

namespace halfplane {

class point_grid
{
public:
    explicit point_grid(const std::vector<complex>& points)
    {
        double low_q = points[0].imag(), high_q = low_q, high_i = points[0].real();
        d_low_i = high_i;
        for (const auto& p : points) {
            d_low_i = std::min(d_low_i, p.real());
            high_i = std::max(high_i, p.real());
            low_q = std::min(low_q, p.imag());
            high_q = std::max(high_q, p.imag());
        }
        d_low_q = low_q;
        const double wide = high_i - d_low_i, tall = high_q - low_q,
                     count = static_cast<double>(points.size());
        // A few points a bucket where they fill a rectangle (at 2.5 the first ring settles a square grid); on
        // a line the longer side alone decides.
        d_pitch = std::max(std::sqrt(2.5 * wide * tall / count), 2 * std::max(wide, tall) / count);
        d_columns = static_cast<int>(wide / d_pitch) + 1;
        d_rows = static_cast<int>(tall / d_pitch) + 1;
        d_first.assign(static_cast<std::size_t>(d_columns) * d_rows + 1, 0);
        for (const auto& p : points)
            ++d_first[bucket(column(p), row(p)) + 1];
        for (std::size_t k = 1; k < d_first.size(); ++k)
            d_first[k] += d_first[k - 1];
        d_index.resize(points.size());
        auto next = d_first;
        for (std::size_t i = 0; i < points.size(); ++i)
            d_index[next[bucket(column(points[i]), row(points[i]))]++] = static_cast<std::uint16_t>(i);
    }

    /// Appends the points whose bucket is `ring` buckets away from that of `p`; false when none can follow.
    bool ring(complex p, int ring, std::vector<std::uint16_t>& out) const
    {
        const int c = column(p), r = row(p);
        if (ring > std::max({c, d_columns - 1 - c, r, d_rows - 1 - r}))
            return false;
        for (int y = std::max(0, r - ring); y <= std::min(d_rows - 1, r + ring); ++y) {
            const bool whole_row = y == r - ring || y == r + ring;
            const int stride = whole_row || ring == 0 ? 1 : 2 * ring;
            for (int x = c - ring; x <= c + ring; x += stride)
                if (x >= 0 && x < d_columns)
                    out.insert(out.end(),
                               d_index.begin() + d_first[bucket(x, y)],
                               d_index.begin() + d_first[bucket(x, y) + 1]);
        }
        return true;
    }

    /// No point outside the rings up to `ring` is closer to p than this.
    double cleared(int ring) const noexcept { return ring * d_pitch; }

private:
    int column(complex p) const
    {
        return std::clamp(static_cast<int>((p.real() - d_low_i) / d_pitch), 0, d_columns - 1);
    }
    int row(complex p) const
    {
        return std::clamp(static_cast<int>((p.imag() - d_low_q) / d_pitch), 0, d_rows - 1);
    }
    std::size_t bucket(int c, int r) const { return static_cast<std::size_t>(r) * d_columns + c; }

    double d_low_i, d_low_q, d_pitch;
    int d_columns, d_rows;
    std::vector<std::uint32_t> d_first;
    std::vector<std::uint16_t> d_index;
};

} // namespace halfplane
