// SPDX-License-Identifier: GPL-3.0-or-later
// align_types: places in the pattern, and the symmetries that decide which hypotheses differ.
#include "align_types.h"

#include "halfplane/geometry.h"

#include <algorithm>
#include <numeric>
#include <tuple>
#include <utility>

namespace halfplane::link {

namespace {

/// Shift registers up to this period are tables that correlation searches; longer ones are solved for by
/// parity.
constexpr std::uint64_t longest_correlated_register = 65536;

/// Whether the points under `image` are the points turned by one common angle.
bool is_turned(const signal_set& set, const std::vector<std::uint16_t>& image, double tolerance)
{
    std::size_t far = 0;
    for (std::size_t i = 0; i < set.size(); ++i)
        if (std::abs(set.points()[i]) > std::abs(set.points()[far]))
            far = i;
    complex turn = set.points()[image[far]] / set.points()[far];
    if (turn == complex{})
        return false;
    turn /= std::abs(turn);
    for (std::size_t i = 0; i < set.size(); ++i)
        if (std::abs(set.points()[i] * turn - set.points()[image[i]]) > tolerance * set.d_min())
            return false;
    return true;
}

/// x with a·x ≡ 1 modulo m, for a coprime to m.
std::uint64_t inverse(std::uint64_t a, std::uint64_t m)
{
    std::int64_t r0 = static_cast<std::int64_t>(m), r1 = static_cast<std::int64_t>(a % m), t0 = 0, t1 = 1;
    while (r1) {
        const std::int64_t q = r0 / r1;
        std::tie(r0, r1) = std::make_pair(r1, r0 - q * r1);
        std::tie(t0, t1) = std::make_pair(t1, t0 - q * t1);
    }
    return static_cast<std::uint64_t>(t0 < 0 ? t0 + static_cast<std::int64_t>(m) : t0);
}

} // namespace

reference::reference(const signal_set& set, const pattern& known)
    : d_set(&set), d_pattern(&known), d_reader(known)
{
    const bool is_register = known.type() == pattern::kind::shift_register;
    const std::uint64_t bits = is_register ? (std::uint64_t{1} << known.stages()) - 1 : 0;
    d_by_bits = is_register && (known.period() > longest_correlated_register ||
                                std::gcd(bits, std::uint64_t{set.label_bits()}) != 1);
    d_modulus = d_by_bits ? bits : known.period();
    d_step = d_by_bits ? set.label_bits() : 1;

    if (known.carries_bits()) {
        std::vector<std::uint16_t> complement(set.size());
        const unsigned all = (1u << set.label_bits()) - 1;
        for (std::size_t i = 0; i < set.size(); ++i)
            complement[i] = static_cast<std::uint16_t>(set.index_of_label(set.labels()[i] ^ all));
        if (!is_turned(set, complement, 1e-3))
            d_complement = std::move(complement);
    }
    for (const auto& p : set.points())
        d_points.emplace_back(static_cast<float>(p.real()), static_cast<float>(p.imag()));
}

std::uint64_t reference::delay(std::uint64_t offset) const noexcept
{
    if (!d_by_bits)
        return offset;
    const std::uint64_t common = std::gcd(d_modulus, d_step), period = d_modulus / common;
    return offset / common * inverse(d_step / common, period) % period;
}

void reference::read(const alignment& a, std::uint64_t symbol, std::size_t count, std::uint16_t* out)
{
    seek(d_reader, a, symbol);
    next(d_reader, a, count, out);
}

void reference::seek(pattern::reader& r, const alignment& a, std::uint64_t symbol) const
{
    if (d_by_bits)
        r.seek_bit(place(a, symbol));
    else
        r.seek(place(a, symbol));
}

void reference::next(pattern::reader& r, const alignment& a, std::size_t count, std::uint16_t* out) const
{
    r.next(count, out);
    if (a.inverted)
        for (std::size_t k = 0; k < count; ++k)
            out[k] = d_complement[out[k]];
}

unsigned rotation_order(const signal_set& set)
{
    return static_cast<unsigned>(count_symmetries(set).rotations);
}

bool on_a_line(const signal_set& set, double tolerance)
{
    const auto& points = set.points();
    const auto far = *std::max_element(
        points.begin(), points.end(), [](complex a, complex b) { return std::abs(a) < std::abs(b); });
    return std::all_of(points.begin(), points.end(), [&](complex p) {
        return std::abs((p * std::conj(far)).imag()) <= tolerance * set.d_min() * std::abs(far);
    });
}

} // namespace halfplane::link
