// SPDX-License-Identifier: GPL-3.0-or-later
// walls: sorts edges by the line they lie on and joins what touches and flips the same bits.
#include "walls.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

/// Lines count as one where they agree to the rounding of coordinates of magnitude 1.
constexpr double same_line = 2e-15;
/// Ends of consecutive edges are one corner; the gap is rounding of its coordinates.
constexpr double same_corner = 1e-9;

/// An edge with its normal in the upper half-plane and everything measured from the coordinate origin.
struct placed {
    wall piece;
    double distance, from, to;
};

placed place(const edge& given, const std::vector<label_t>& labels)
{
    const bool lower = given.normal.imag() < 0 || (given.normal.imag() == 0 && given.normal.real() < 0);
    placed out{{lower ? given.reversed() : given, 0, 0}, 0, 0, 0};
    const edge& e = out.piece.line;
    out.piece.mask = labels[e.inner] ^ labels[e.outer];
    out.piece.inner_bits = labels[e.inner] & out.piece.mask;
    const auto seen = e.seen_from({0, 0});
    out.distance = seen.height;
    out.from = seen.from;
    out.to = seen.to;
    return out;
}

bool continues(const placed& a, const placed& b)
{
    return a.piece.mask == b.piece.mask && a.piece.inner_bits == b.piece.inner_bits &&
           std::abs(a.piece.line.normal - b.piece.line.normal) <= same_line &&
           std::abs(a.distance - b.distance) <= same_line && std::abs(b.from - a.to) <= same_corner;
}

std::vector<wall> join(const cells& regions, const std::vector<label_t>& labels)
{
    std::vector<placed> all;
    all.reserve(regions.edges().size());
    for (const auto& e : regions.edges())
        all.push_back(place(e, labels));
    // A coarse key keeps the pieces of one line together; a line that happens to straddle two keys is merely
    // not joined, which costs time and nothing else.
    const auto key = [](double x) { return std::floor(x * 1e12 + 0.5); };
    std::sort(all.begin(), all.end(), [&](const placed& a, const placed& b) {
        const auto ka = key(a.piece.line.normal.real()), kb = key(b.piece.line.normal.real());
        if (ka != kb)
            return ka < kb;
        const auto da = key(a.distance), db = key(b.distance);
        return da != db ? da < db : a.from < b.from;
    });
    std::vector<wall> out;
    for (std::size_t k = 0; k < all.size();) {
        std::size_t last = k;
        while (last + 1 < all.size() && continues(all[last], all[last + 1]))
            ++last;
        wall joined = all[k].piece;
        joined.line.to += all[last].to - all[k].to;
        if (std::isinf(all[last].to))
            joined.line.to = all[last].to;
        out.push_back(joined);
        k = last + 1;
    }
    return out;
}

complex centre_of(const wall& w)
{
    const edge& e = w.line;
    const complex along(-e.normal.imag(), e.normal.real());
    return e.origin + e.offset * e.normal + 0.5 * (e.from + e.to) * along;
}

double radius_of(const wall& w)
{
    return 0.5 * (w.line.to - w.line.from);
}

/// Halves the walls along the longer side of their extent until few are left to a block.
void split(std::vector<wall>& walls, std::uint32_t first, std::uint32_t last, std::vector<wall_block>& blocks)
{
    constexpr std::uint32_t few = 16;
    complex low = centre_of(walls[first]), high = low;
    for (std::uint32_t k = first; k < last; ++k) {
        const complex c = centre_of(walls[k]);
        low = {std::min(low.real(), c.real()), std::min(low.imag(), c.imag())};
        high = {std::max(high.real(), c.real()), std::max(high.imag(), c.imag())};
    }
    if (last - first <= few) {
        wall_block block{first, last, 0.5 * (low + high), 0};
        for (std::uint32_t k = first; k < last; ++k)
            block.radius =
                std::max(block.radius, std::abs(centre_of(walls[k]) - block.centre) + radius_of(walls[k]));
        blocks.push_back(block);
        return;
    }
    const std::uint32_t middle = first + (last - first) / 2;
    const bool wide = high.real() - low.real() >= high.imag() - low.imag();
    std::nth_element(walls.begin() + first,
                     walls.begin() + middle,
                     walls.begin() + last,
                     [&](const wall& a, const wall& b) {
                         return wide ? centre_of(a).real() < centre_of(b).real()
                                     : centre_of(a).imag() < centre_of(b).imag();
                     });
    split(walls, first, middle, blocks);
    split(walls, middle, last, blocks);
}

double squared_approach(double height, const edge& e)
{
    const double aside = std::max({0.0, e.from, -e.to});
    return height * height + aside * aside;
}

} // namespace

wall_map build_walls(const cells& regions, const std::vector<label_t>& labels, unsigned label_bits)
{
    wall_map out;
    out.walls = join(regions, labels);
    const auto bounded = std::stable_partition(
        out.walls.begin(), out.walls.end(), [](const wall& w) { return std::isinf(radius_of(w)); });
    const auto unbounded = static_cast<std::uint32_t>(bounded - out.walls.begin());
    const auto count = static_cast<std::uint32_t>(out.walls.size());
    if (unbounded > 0)
        out.blocks.push_back({0, unbounded, 0, INFINITY});
    if (unbounded < count)
        split(out.walls, unbounded, count, out.blocks);
    out.approach.assign(label_bits, INFINITY);
    for (const auto& e : regions.edges()) {
        const double near = squared_approach(e.offset, e);
        for (unsigned left = labels[e.inner] ^ labels[e.outer]; left != 0; left &= left - 1) {
            double& least = out.approach[static_cast<unsigned>(__builtin_ctz(left))];
            least = std::min(least, near);
        }
    }
    return out;
}

} // namespace halfplane
