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

} // namespace

std::vector<wall> build_walls(const cells& regions, const std::vector<label_t>& labels)
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

} // namespace halfplane
