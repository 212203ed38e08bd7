// SPDX-License-Identifier: GPL-3.0-or-later
// information_grid: sums of Gaussians tile by tile, one exponential a point and axis.
#include "information_grid.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <map>

namespace halfplane::detail {

namespace {

constexpr double step = 0.1;
constexpr double reach = 5.6; ///< exp(−reach²) = 2e-14: mass that a point may leave outside
constexpr int tile_side = 64; ///< grid places a side

/// exp(−x²)/√π · step at the grid places first, first + 1, … around a coordinate.
struct bell {
    std::int64_t first;
    std::vector<double> values;

    bell(double centre, double shift)
    {
        first = static_cast<std::int64_t>(std::ceil((centre - reach) / step - shift));
        const auto last = static_cast<std::int64_t>(std::floor((centre + reach) / step - shift));
        const double scale = step / std::sqrt(std::acos(-1.0));
        for (std::int64_t k = first; k <= last; ++k) {
            const double x = (static_cast<double>(k) + shift) * step - centre;
            values.push_back(scale * std::exp(-x * x));
        }
    }
    std::int64_t end() const { return first + static_cast<std::int64_t>(values.size()); }
};

/// Mass at each place of one tile, of all points and of those with a 1 at each bit, and what it adds.
class tile
{
public:
    tile(unsigned label_bits, std::size_t places)
        : d_all(places), d_ones(label_bits, std::vector<double>(places))
    {
    }

    void clear()
    {
        std::fill(d_all.begin(), d_all.end(), 0.0);
        for (auto& ones : d_ones)
            std::fill(ones.begin(), ones.end(), 0.0);
    }

    /// weight · values at the places from `at` on, for a point with this label.
    void add(std::size_t at, const double* values, std::size_t count, double weight, label_t label)
    {
        for (std::size_t k = 0; k < count; ++k)
            d_all[at + k] += weight * values[k];
        const auto bits = static_cast<unsigned>(d_ones.size());
        for (unsigned b = 0; b < bits; ++b)
            if (label >> (bits - 1 - b) & 1)
                for (std::size_t k = 0; k < count; ++k)
                    d_ones[b][at + k] += weight * values[k];
    }

    /// −Σ m·log2 m over the masses; the zeros' share of a bit is all less the ones', right to ε of all.
    void total(mixture_entropies& sums) const
    {
        for (std::size_t k = 0; k < d_all.size(); ++k) {
            if (d_all[k] == 0)
                continue;
            sums.all += surprise(d_all[k]);
            for (std::size_t b = 0; b < d_ones.size(); ++b)
                sums.by_bit[b] += surprise(d_ones[b][k]) + surprise(d_all[k] - d_ones[b][k]);
        }
    }

private:
    static double surprise(double mass) { return mass > 0 ? -mass * std::log2(mass) : 0; }

    std::vector<double> d_all;
    std::vector<std::vector<double>> d_ones;
};

std::int64_t tile_of(std::int64_t place)
{
    return place >= 0 ? place / tile_side : -((-place + tile_side - 1) / tile_side);
}

/// From masses on places of a size back to a density.
void finish(mixture_entropies& sums, double place_size)
{
    sums.all += std::log2(place_size);
    for (double& h : sums.by_bit)
        h += std::log2(place_size);
}

} // namespace

mixture_entropies plane_entropies(const std::vector<complex>& points,
                                  const std::vector<double>& priors,
                                  const std::vector<label_t>& labels,
                                  unsigned label_bits,
                                  double shift)
{
    // Which points reach into which tile; far points leave all tiles between them untouched.
    std::vector<std::array<bell, 2>> bells;
    std::map<std::pair<std::int64_t, std::int64_t>, std::vector<std::size_t>> touched;
    for (std::size_t i = 0; i < points.size(); ++i) {
        bells.push_back({bell(points[i].real(), shift), bell(points[i].imag(), shift)});
        const auto& [x, y] = bells.back();
        for (auto row = tile_of(y.first); row <= tile_of(y.end() - 1); ++row)
            for (auto column = tile_of(x.first); column <= tile_of(x.end() - 1); ++column)
                touched[{row, column}].push_back(i);
    }

    mixture_entropies sums{0, std::vector<double>(label_bits)};
    tile here(label_bits, tile_side * tile_side);
    for (const auto& [place, members] : touched) {
        here.clear();
        const auto top = place.first * tile_side, left = place.second * tile_side;
        for (std::size_t i : members) {
            const auto& [x, y] = bells[i];
            const auto from = std::max(left, x.first), to = std::min(left + tile_side, x.end());
            for (auto row = std::max(top, y.first); row < std::min(top + tile_side, y.end()); ++row)
                here.add(static_cast<std::size_t>((row - top) * tile_side + from - left),
                         x.values.data() + (from - x.first),
                         static_cast<std::size_t>(to - from),
                         priors[i] * y.values[static_cast<std::size_t>(row - y.first)],
                         labels[i]);
        }
        here.total(sums);
    }
    finish(sums, step * step);
    return sums;
}

mixture_entropies line_entropies(const std::vector<double>& points,
                                 const std::vector<double>& priors,
                                 const std::vector<label_t>& labels,
                                 unsigned label_bits,
                                 double shift)
{
    std::vector<bell> bells;
    std::map<std::int64_t, std::vector<std::size_t>> touched;
    for (std::size_t i = 0; i < points.size(); ++i) {
        bells.emplace_back(points[i], shift);
        for (auto t = tile_of(bells[i].first); t <= tile_of(bells[i].end() - 1); ++t)
            touched[t].push_back(i);
    }
    mixture_entropies sums{0, std::vector<double>(label_bits)};
    tile here(label_bits, tile_side);
    for (const auto& [place, members] : touched) {
        here.clear();
        const auto left = place * tile_side;
        for (std::size_t i : members) {
            const auto from = std::max(left, bells[i].first), to = std::min(left + tile_side, bells[i].end());
            here.add(static_cast<std::size_t>(from - left),
                     bells[i].values.data() + (from - bells[i].first),
                     static_cast<std::size_t>(to - from),
                     priors[i],
                     labels[i]);
        }
        here.total(sums);
    }
    finish(sums, step);
    return sums;
}

} // namespace halfplane::detail
