// SPDX-License-Identifier: GPL-3.0-or-later
// align_types: what the parts of the aligner share: the memory of samples, a place in the pattern, the
// reference it gives.
#pragma once

#include "halfplane/pattern.h"
#include "halfplane/signal_set.h"

#include <cmath>
#include <complex>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace halfplane::link {

using sample = std::complex<float>;

/// Product without the detour for infinities that std::complex takes; not-a-number stays what it is.
inline sample times(sample a, sample b) noexcept
{
    return {a.real() * b.real() - a.imag() * b.imag(), a.real() * b.imag() + a.imag() * b.real()};
}
/// a·conj(b)
inline sample times_conj(sample a, sample b) noexcept
{
    return {a.real() * b.real() + a.imag() * b.imag(), a.imag() * b.real() - a.real() * b.imag()};
}
inline float energy(sample a) noexcept
{
    return a.real() * a.real() + a.imag() * a.imag();
}

/// out[k] = e^{j(start + k·step)}, radians, by doubling: few roundings, and no chain of products as long as
/// the run.
inline void phasors(double start, double step, std::size_t count, sample* out) noexcept
{
    out[0] = sample(std::polar(1.0, start));
    for (std::size_t have = 1; have < count; have *= 2) {
        const sample by(std::polar(1.0, step * static_cast<double>(have)));
        const std::size_t more = have < count - have ? have : count - have;
        for (std::size_t k = 0; k < more; ++k)
            out[have + k] = times(out[k], by);
    }
}

/// Samples fit for sums: finite, and so small that squares summed over any window stay finite too.
inline bool usable(sample a) noexcept
{
    return energy(a) < 1e30f;
}

/// The last `capacity` values of a stream, by absolute number.
template <typename T>
class ring
{
public:
    explicit ring(std::size_t capacity) : d_data(capacity), d_mask(capacity - 1) {}
    T& operator[](std::uint64_t number) noexcept { return d_data[number & d_mask]; }
    const T& operator[](std::uint64_t number) const noexcept { return d_data[number & d_mask]; }
    std::size_t capacity() const noexcept { return d_data.size(); }

private:
    std::vector<T> d_data;
    std::uint64_t d_mask;
};

/*!
 * How the stream lies against the pattern. `offset` is the place of symbol 0 of the stream, whether or not
 * the signal was there by then; equal offsets are the same delay. Places are counted in symbols where the
 * pattern is a table, in bits of the sequence where it is searched by parity (its symbols may begin with any
 * bit).
 */
struct alignment {
    std::uint64_t offset = 0;
    bool mirrored = false, inverted = false;
    bool operator==(const alignment& o) const noexcept
    {
        return offset == o.offset && mirrored == o.mirrored && inverted == o.inverted;
    }
};

/*!
 * The pattern as seen by the aligner: places and their arithmetic, both polarities of bits, points as floats.
 */
class reference
{
public:
    reference(const signal_set& set, const pattern& known);

    /// Whether places are bits of a shift register rather than symbols.
    bool by_bits() const noexcept { return d_by_bits; }
    /// Places repeat after as many.
    std::uint64_t modulus() const noexcept { return d_modulus; }
    /// Places that one symbol covers.
    std::uint64_t step() const noexcept { return d_step; }
    std::uint64_t place(const alignment& a, std::uint64_t symbol) const noexcept
    {
        return (a.offset + symbol % d_modulus * d_step) % d_modulus;
    }
    /// The offset at which symbol `symbol` lies on `place`.
    std::uint64_t offset(std::uint64_t place, std::uint64_t symbol) const noexcept
    {
        return (place + d_modulus - symbol % d_modulus * d_step % d_modulus) % d_modulus;
    }
    /// An offset as pattern position in symbols.
    std::uint64_t delay(std::uint64_t offset) const noexcept;

    /// Whether complementing all bits is a hypothesis of its own (and not the same as turning the set).
    bool can_invert() const noexcept { return !d_complement.empty(); }
    /// Index of the point with the complement of index i's label; only with can_invert().
    std::uint16_t complement(std::uint16_t i) const noexcept { return d_complement[i]; }

    const std::vector<sample>& points() const noexcept { return d_points; }
    const signal_set& set() const noexcept { return *d_set; }
    const pattern& known() const noexcept { return *d_pattern; }

    /// Indices sent under `a` from symbol `symbol` of the stream on.
    void read(const alignment& a, std::uint64_t symbol, std::size_t count, std::uint16_t* out);
    /// The same through a reader of the caller's, who reads on without seeking.
    void seek(pattern::reader& r, const alignment& a, std::uint64_t symbol) const;
    void next(pattern::reader& r, const alignment& a, std::size_t count, std::uint16_t* out) const;

private:
    const signal_set* d_set;
    const pattern* d_pattern;
    pattern::reader d_reader;
    bool d_by_bits;
    std::uint64_t d_modulus, d_step;
    std::vector<std::uint16_t> d_complement;
    std::vector<sample> d_points;
};

/// Rotations about the origin that carry the set onto itself, the identity among them (geometry.h's
/// tolerance).
unsigned rotation_order(const signal_set& set);

/// Whether all points lie on one line through the origin, so that a mirror image is but a turned one.
bool on_a_line(const signal_set& set, double tolerance = 1e-3);

} // namespace halfplane::link
