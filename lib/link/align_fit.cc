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

void fetch(const ring<sample>& raw, bool mirrored, std::uint64_t begin, std::uint64_t end, sample* out)
{
    for (std::uint64_t k = begin; k < end; ++k)
        *out++ = mirrored ? std::conj(raw[k]) : raw[k];
}

std::optional<fit> fit_stretch(
    reference& ref, const ring<sample>& raw, const alignment& a, std::uint64_t begin, std::uint64_t end)
{
    const std::size_t count = end - begin;
    std::vector<sample> z(count);
    std::vector<std::uint16_t> sent(count);
    fetch(raw, a.mirrored, begin, end, z.data());
    ref.read(a, begin, count, sent.data());

    std::vector<complex> cross;
    std::vector<double> at;
    double sent_energy = 0, received_energy = 0, used = 0;
    for (std::size_t k = 0; k < count; k += stretch) {
        const std::size_t n = std::min(stretch, count - k);
        moments m;
        m.add(&z[k], &sent[k], ref.points().data(), n);
        cross.push_back(m.cross());
        at.push_back(static_cast<double>(k) + static_cast<double>(n - 1) / 2 - static_cast<double>(count));
        sent_energy += m.sent();
        received_energy += m.received();
        used += m.n;
    }
    if (!(sent_energy > 0) || !(received_energy > 0))
        return std::nullopt;

    const auto spectrum = [&](double f) {
        complex sum{};
        for (std::size_t j = 0; j < cross.size(); ++j)
            sum += cross[j] * std::polar(1.0, -2 * M_PI * f * at[j]);
        return sum;
    };
    const double step = 1 / (8.0 * static_cast<double>(count));
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

    fit result;
    const complex x = spectrum(f);
    result.frequency = f;
    result.end = end;
    result.gain = x / sent_energy;
    result.standing_gain = spectrum(0) / sent_energy;
    result.coefficient = std::min(1.0, std::abs(x) / std::sqrt(sent_energy * received_energy));
    result.symbols = static_cast<std::size_t>(used);
    const double rho2 = result.coefficient * result.coefficient;
    const double snr = rho2 / std::max(1 - rho2, 1e-9);
    result.frequency_sd = std::sqrt(6 / (snr * used)) / (2 * M_PI * used);
    return result;
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
