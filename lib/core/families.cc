// SPDX-License-Identifier: GPL-3.0-or-later
// families: points and labels of psk, qam, cross, hex, star and apsk.
#include "families.h"

#include "label_tables.h"
#include "refusal.h"
#include "rings.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <numeric>

namespace halfplane::detail {

namespace {

bool power_of_two(std::size_t n)
{
    return n && (n & (n - 1)) == 0;
}

void require_size(std::size_t size)
{
    if (size < signal_set::min_size || size > signal_set::max_size)
        refuse<invalid_set>(
            "the size must be ", signal_set::min_size, " to ", signal_set::max_size, ", got ", size);
}

/// A point of the hexagonal lattice in integers: the plane's x, and √3·y.
struct hex_point {
    std::int64_t x, y3;
    std::int64_t energy3() const { return 3 * x * x + y3 * y3; } ///< 3·|z|²
    bool lower_half() const { return y3 < 0 || (y3 == 0 && x < 0); }
};

/// By distance from 0, then counter-clockwise from the positive real axis; integers only.
bool ring_order(const hex_point& a, const hex_point& b)
{
    if (a.energy3() != b.energy3())
        return a.energy3() < b.energy3();
    // (0, π) and the positive axis before the negative axis and (π, 2π)
    if (a.lower_half() != b.lower_half())
        return b.lower_half();
    return a.x * b.y3 - a.y3 * b.x > 0;
}

/// The `size` lattice points nearest to a centre (cx, cy3), relative to it.
std::vector<hex_point> nearest_hex(std::size_t size, std::int64_t cx, std::int64_t cy3)
{
    const auto reach = static_cast<std::int64_t>(std::ceil(std::sqrt(static_cast<double>(size)))) + 3;
    std::vector<hex_point> all;
    for (std::int64_t row = -reach; row <= reach; ++row)
        for (std::int64_t k = -2 * reach; k <= 2 * reach; ++k)
            all.push_back({2 * k + row - cx, 3 * row - cy3});
    std::sort(all.begin(), all.end(), ring_order);
    all.resize(size);
    return all;
}

/// 3·M·(energy about the mean), an integer.
std::int64_t spread(const std::vector<hex_point>& set)
{
    std::int64_t sum = 0, x = 0, y3 = 0;
    for (const auto& p : set) {
        sum += p.energy3();
        x += p.x;
        y3 += p.y3;
    }
    return static_cast<std::int64_t>(set.size()) * sum - 3 * x * x - y3 * y3;
}

} // namespace

unsigned bits_for(std::size_t size) noexcept
{
    unsigned bits = 1;
    while ((std::size_t{1} << bits) < size)
        ++bits;
    return bits;
}

unsigned gray_rank(unsigned word) noexcept
{
    for (unsigned shift = 1; shift < 32; shift *= 2)
        word ^= word >> shift;
    return word;
}

signal_set psk(std::size_t size)
{
    require_size(size);
    std::vector<complex> points(size);
    for (std::size_t k = 0; k < size; ++k)
        points[k] = on_unit_circle(k, size);

    // A closed Gray walk over an even number of words: half of them up with a leading 0, the mirrored way
    // back with a leading 1. A closed walk that flips one bit a step cannot be odd; leaving one word out of
    // the next even walk costs one step of two bits, the least possible since the flips of every bit must be
    // even.
    const unsigned bits = bits_for(size);
    const unsigned half = static_cast<unsigned>(size + 1) / 2;
    std::vector<label_t> labels(size);
    for (unsigned k = 0; k < size; ++k)
        labels[k] = static_cast<label_t>(k < half ? gray(k) : gray(2 * half - 1 - k) | 1u << (bits - 1));
    return {std::move(points), std::move(labels), bits};
}

signal_set qam(std::size_t size)
{
    if (!power_of_two(size) || size < 2 || size > signal_set::max_size)
        refuse<invalid_set>("qam takes a power of two from 2 to ", signal_set::max_size, ", got ", size);
    const unsigned bits = bits_for(size), row_bits = bits / 2, column_bits = bits - row_bits;
    const int rows = 1 << row_bits, columns = 1 << column_bits;
    std::vector<complex> points;
    std::vector<label_t> labels;
    for (int r = 0; r < rows; ++r)
        for (int c = 0; c < columns; ++c) {
            points.emplace_back(2 * c - columns + 1, rows == 1 ? 0 : 2 * r - rows + 1);
            labels.push_back(static_cast<label_t>(gray(static_cast<unsigned>(c)) << row_bits |
                                                  gray(static_cast<unsigned>(r))));
        }
    return {std::move(points), std::move(labels), bits};
}

signal_set cross(std::size_t size)
{
    if (size != 32 && size != 128 && size != 512 && size != 2048)
        refuse<invalid_set>("cross takes 32, 128, 512 or 2048, got ", size);
    // A square of side 6, 12, 24, 48 less four corners of side 1, 2, 4, 8.
    const int corner = static_cast<int>(std::lround(std::sqrt(static_cast<double>(size) / 32)));
    const int side = 6 * corner;
    const auto outer = [&](int k) { return k < corner || k >= side - corner; };
    std::vector<complex> points;
    for (int r = 0; r < side; ++r)
        for (int c = 0; c < side; ++c)
            if (!(outer(r) && outer(c)))
                points.emplace_back(2 * c - side + 1, 2 * r - side + 1);
    return {std::move(points), cross_labels(size), bits_for(size)};
}

signal_set hex(std::size_t size)
{
    require_size(size);
    constexpr std::array<std::pair<int, int>, 3> centres{{{0, 0}, {1, 1}, {1, 0}}};
    std::vector<hex_point> best;
    for (const auto& [cx, cy3] : centres) {
        auto candidate = nearest_hex(size, cx, cy3);
        if (best.empty() || spread(candidate) < spread(best))
            best = std::move(candidate);
    }
    // About their mean, in units of 1/M to stay with integers.
    const auto m = static_cast<std::int64_t>(size);
    std::int64_t x = 0, y3 = 0;
    for (const auto& p : best) {
        x += p.x;
        y3 += p.y3;
    }
    for (auto& p : best)
        p = {m * p.x - x, m * p.y3 - y3};
    std::sort(best.begin(), best.end(), ring_order);
    std::vector<complex> points;
    for (const auto& p : best)
        points.emplace_back(static_cast<double>(p.x) / static_cast<double>(m),
                            static_cast<double>(p.y3) / (static_cast<double>(m) * std::sqrt(3.0)));
    return signal_set::with_natural_labels(std::move(points));
}

signal_set rings(const std::vector<std::size_t>& counts, const std::vector<double>& ratios, ring_start start)
{
    require_size(std::accumulate(counts.begin(), counts.end(), std::size_t{0}));
    const std::size_t centre = counts.front() == 1 ? 1 : 0;
    if (counts.size() != ratios.size() + 1 + centre)
        refuse<invalid_set>(counts.size() - centre,
                            " rings about 0 need ",
                            counts.size() - centre - 1,
                            " radius ratios to the innermost, got ",
                            ratios.size());
    std::vector<complex> points;
    for (std::size_t r = 0; r < counts.size(); ++r) {
        const double radius = r < centre ? 0 : r == centre ? 1 : ratios[r - centre - 1];
        for (std::size_t k = 0; k < counts[r]; ++k)
            points.push_back(radius * (start == ring_start::half_step
                                           ? on_unit_circle(2 * k + 1, 2 * counts[r])
                                           : on_unit_circle(k, counts[r])) +
                             complex{});
    }
    return signal_set::with_natural_labels(std::move(points));
}

} // namespace halfplane::detail
