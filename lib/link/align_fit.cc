// SPDX-License-Identifier: GPL-3.0-or-later
// align_fit: data-aided least squares with a frequency search, and agreement beyond chance.
#include "align_fit.h"

#include <algorithm>

namespace halfplane::link {

namespace {

constexpr std::size_t stretch = 128;      ///< symbols over which the phase counts as standing
constexpr double widest_frequency = 2e-4; ///< cycles a symbol: twice what is promised

} // namespace

void moments::add(const sample* received,
                  const std::uint16_t* indices,
                  const sample* points,
                  std::size_t count)
{
    float n_ = 0, rr_ = 0, ss_ = 0, xr = 0, xi = 0, rre = 0, rim = 0, sre = 0, sim = 0;
    for (std::size_t k = 0; k < count; ++k) {
        const bool good = usable(received[k]);
        const sample z = good ? received[k] : sample{};
        const sample p = good ? points[indices[k]] : sample{};
        const sample x = times_conj(z, p);
        n_ += good ? 1.0f : 0.0f;
        rr_ += energy(z);
        ss_ += energy(p);
        xr += x.real();
        xi += x.imag();
        rre += z.real();
        rim += z.imag();
        sre += p.real();
        sim += p.imag();
    }
    *this += moments{n_, rr_, ss_, {xr, xi}, {rre, rim}, {sre, sim}};
}

moments& moments::operator+=(const moments& o) noexcept
{
    n += o.n;
    rr += o.rr;
    ss += o.ss;
    rs += o.rs;
    r += o.r;
    s += o.s;
    return *this;
}

void turning_gain::undo(const sample* r, std::uint64_t first, std::size_t count, sample* out) const
{
    // Whole cycles are dropped before they cost digits.
    const double cycles = std::fmod(frequency * static_cast<double>(first - at), 1.0);
    std::vector<sample> turn(count);
    phasors(-2 * M_PI * cycles - std::arg(gain), -2 * M_PI * frequency, count, turn.data());
    const auto scale = static_cast<float>(1 / std::abs(gain));
    for (std::size_t k = 0; k < count; ++k)
        out[k] = times(r[k], turn[k] * scale);
}

void fetch(const ring<sample>& raw, bool mirrored, std::uint64_t begin, std::uint64_t end, sample* out)
{
    for (std::uint64_t k = begin; k < end; ++k)
        *out++ = mirrored ? std::conj(raw[k]) : raw[k];
}

namespace {

/// Moments of consecutive blocks of `stretch` symbols, and where their middles lie before the end.
struct blocks_of_moments {
    std::vector<moments> sums;
    std::vector<double> at;
    std::size_t count = 0; ///< symbols in all

    blocks_of_moments(
        reference& ref, const ring<sample>& raw, const alignment& a, std::uint64_t begin, std::uint64_t end)
        : count(end - begin)
    {
        std::vector<sample> z(count);
        std::vector<std::uint16_t> sent(count);
        fetch(raw, a.mirrored, begin, end, z.data());
        ref.read(a, begin, count, sent.data());
        for (std::size_t k = 0; k < count; k += stretch) {
            const std::size_t n = std::min(stretch, count - k);
            sums.emplace_back().add(&z[k], &sent[k], ref.points().data(), n);
            at.push_back(static_cast<double>(k) + static_cast<double>(n - 1) / 2 -
                         static_cast<double>(count));
        }
    }
};

/// Gain and frequency of the blocks from `first` on, |frequency| ≤ 2e-4.
class line_fit
{
public:
    line_fit(const blocks_of_moments& blocks, std::size_t first) : d_blocks(blocks), d_first(first)
    {
        for (std::size_t j = first; j < blocks.sums.size(); ++j) {
            d_sent += blocks.sums[j].sent();
            d_received += blocks.sums[j].received();
            d_used += blocks.sums[j].n;
        }
        if (!empty())
            find_frequency();
    }

    bool empty() const noexcept { return !(d_sent > 0) || !(d_received > 0); }

    /// Σ|r − gain·s·e^…|² of one block, means taken out, which may lie outside the blocks fitted.
    double rest(std::size_t j) const
    {
        const auto& b = d_blocks.sums[j];
        const complex g = d_spectrum / d_sent * std::polar(1.0, 2 * M_PI * d_frequency * d_blocks.at[j]);
        return b.received() - 2 * (std::conj(g) * b.cross()).real() + std::norm(g) * b.sent();
    }

    fit result(std::uint64_t end) const
    {
        fit f;
        f.frequency = d_frequency;
        f.end = end;
        f.gain = d_spectrum / d_sent;
        f.standing_gain = spectrum(0) / d_sent;
        f.coefficient = std::min(1.0, std::abs(d_spectrum) / std::sqrt(d_sent * d_received));
        f.symbols = static_cast<std::size_t>(d_used);
        const double rho2 = f.coefficient * f.coefficient;
        const double snr = rho2 / std::max(1 - rho2, 1e-9);
        f.frequency_sd = std::sqrt(6 / (snr * d_used)) / (2 * M_PI * d_used);
        return f;
    }

private:
    complex spectrum(double f) const
    {
        complex sum{};
        for (std::size_t j = d_first; j < d_blocks.sums.size(); ++j)
            sum += d_blocks.sums[j].cross() * std::polar(1.0, -2 * M_PI * f * d_blocks.at[j]);
        return sum;
    }

    void find_frequency()
    {
        const double step = 1 / (8.0 * static_cast<double>(d_blocks.count));
        const int steps = static_cast<int>(std::ceil(widest_frequency / step));
        int best = 0;
        double highest = -1;
        for (int i = -steps; i <= steps; ++i)
            if (const double p = std::norm(spectrum(i * step)); p > highest) {
                highest = p;
                best = i;
            }
        double f = best * step;
        for (double width = step; width > step / 100;
             width /= 3) { // parabolas through three points, ever narrower
            const double low = std::norm(spectrum(f - width)), mid = std::norm(spectrum(f)),
                         high = std::norm(spectrum(f + width));
            const double bend = low - 2 * mid + high;
            if (bend < 0)
                f += std::clamp(0.5 * (low - high) / bend, -1.0, 1.0) * width;
        }
        d_frequency = f;
        d_spectrum = spectrum(f);
    }

    const blocks_of_moments& d_blocks;
    const std::size_t d_first;
    double d_sent = 0, d_received = 0, d_used = 0, d_frequency = 0;
    complex d_spectrum{};
};

/*!
 * First block from which on the signal is what it is at the end: a receiver that starts hands over filters
 * filling up and loops pulling in, and a gain learnt from those is wrong for long. The second half of the
 * stretch is fitted, and blocks before it are taken in while what they leave over is like what the half
 * leaves: six standard deviations of a sum of squares.
 */
std::size_t first_sound(const blocks_of_moments& blocks)
{
    const std::size_t half = blocks.sums.size() / 2;
    const line_fit late(blocks, half);
    if (late.empty())
        return 0;
    double rest = 0, symbols = 0;
    for (std::size_t j = half; j < blocks.sums.size(); ++j) {
        rest += late.rest(j);
        symbols += blocks.sums[j].n;
    }
    std::size_t first = half;
    for (; first > 0; --first) {
        const double n = blocks.sums[first - 1].n;
        if (late.rest(first - 1) > rest / symbols * (n + 6 * std::sqrt(n)))
            break;
    }
    return first;
}

} // namespace

std::optional<fit> fit_stretch(
    reference& ref, const ring<sample>& raw, const alignment& a, std::uint64_t begin, std::uint64_t end)
{
    const blocks_of_moments blocks(ref, raw, a, begin, end);
    const line_fit line(blocks, first_sound(blocks));
    if (line.empty())
        return std::nullopt;
    return line.result(end);
}

double agreement(reference& ref,
                 const kernels::point_decider& decider,
                 const ring<sample>& raw,
                 const alignment& a,
                 const fit& f,
                 std::uint64_t begin,
                 std::uint64_t end)
{
    const std::size_t count = end - begin;
    std::vector<sample> z(count);
    std::vector<std::uint16_t> sent(count), decided(count);
    fetch(raw, a.mirrored, begin, end, z.data());
    ref.read(a, begin, count, sent.data());
    for (std::size_t k = 0; k < count; ++k) {
        const double phase = 2 * M_PI * f.frequency * (static_cast<double>(k) - static_cast<double>(count));
        z[k] = times(z[k], sample(std::polar(1.0, -phase) / f.gain));
    }
    decider.decide(z.data(), decided.data(), count);

    std::vector<double> of_sent(ref.points().size()), of_decided(ref.points().size());
    double same = 0, n = 0;
    for (std::size_t k = 0; k < count; ++k) {
        if (decided[k] == kernels::point_decider::nonfinite)
            continue;
        n += 1;
        same += decided[k] == sent[k];
        of_sent[sent[k]] += 1;
        of_decided[decided[k]] += 1;
    }
    if (n == 0)
        return 0;
    double chance = 0;
    for (std::size_t i = 0; i < of_sent.size(); ++i)
        chance += of_sent[i] / n * (of_decided[i] / n);
    // With many points chance is all but nothing; three agreements are then no evidence yet.
    const double variance = std::max(n * chance * (1 - chance), 1.0);
    return (same - n * chance) / std::sqrt(variance);
}

} // namespace halfplane::link
