// SPDX-License-Identifier: GPL-3.0-or-later
// align_blind: Es/N0 from radii, then phase and frequency from the harmonics of the mixture's log-likelihood.
#include "align_blind.h"

#include <algorithm>
#include <map>

namespace halfplane::link {

namespace {

constexpr std::size_t bins = 128;           ///< of the radius
constexpr double widest_frequency = 1.2e-4; ///< cycles a symbol: what is promised, and room

/// e^{−x}·I0(x) for x ≥ 0, relative error below 2e-7 (Abramowitz and Stegun, 9.8.1 and 9.8.2; coefficients
/// from memory).
double scaled_bessel_i0(double x)
{
    if (x < 3.75) {
        const double t = x / 3.75 * (x / 3.75);
        return std::exp(-x) *
               (1 +
                t * (3.5156229 +
                     t * (3.0899424 + t * (1.2067492 + t * (0.2659732 + t * (0.0360768 + t * 0.0045813))))));
    }
    const double t = 3.75 / x;
    return (0.39894228 +
            t * (0.01328592 +
                 t * (0.00225319 + t * (-0.00157565 +
                                        t * (0.00916281 + t * (-0.02057706 +
                                                               t * (0.02635537 + t * (-0.01647633 +
                                                                                      t * 0.00392377)))))))) /
           std::sqrt(x);
}

sample power(sample base, unsigned exponent)
{
    sample result{1, 0};
    for (; exponent; exponent >>= 1, base = times(base, base))
        if (exponent & 1)
            result = times(result, base);
    return result;
}

} // namespace

blind_phase::blind_phase(const signal_set& set) : d_set(&set), d_rotations(rotation_order(set))
{
    // Beyond some 16 lobes a turn the next harmonic is drowned at any Es/N0 where it would be needed.
    d_harmonics = std::clamp(16u / d_rotations, 1u, 4u);
    double peak = 0;
    std::map<long, double> rings; // radius in thousandths of the rms → probability
    for (std::size_t i = 0; i < set.size(); ++i) {
        const double radius = std::abs(set.points()[i]) / std::sqrt(set.es());
        peak = std::max(peak, radius);
        rings[std::lround(1000 * radius)] += set.priors()[i];
    }
    d_bins_per_rms = bins / (peak + 1.5);

    // From where hardly anything can be told to where neighbours lie ten standard deviations apart, or noise
    // becomes narrower than a bin.
    const double highest =
        std::min(200 * set.es() / (set.d_min() * set.d_min()), d_bins_per_rms * d_bins_per_rms / 2);
    for (double snr = 0.5; snr < highest; snr *= std::pow(10, 0.2)) {
        level l{snr, std::vector<double>(bins), {}};
        const double n0 = 1 / (1 + snr), scale = std::sqrt(snr / (1 + snr));
        for (std::size_t b = 0; b < bins; ++b) {
            const double radius = (static_cast<double>(b) + 0.5) / d_bins_per_rms;
            double density = 0;
            for (const auto& [thousandths, p] : rings) {
                const double ring = scale * static_cast<double>(thousandths) / 1000;
                const double off = radius - ring;
                density += p * std::exp(-off * off / n0) * scaled_bessel_i0(2 * radius * ring / n0);
            }
            l.log_radius[b] = std::log(std::max(density * 2 * radius / n0, 1e-12));
        }
        d_levels.push_back(std::move(l));
    }
}

void blind_phase::fill_harmonics(level& l) const
{
    const double n0 = 1 / (1 + l.snr), scale = std::sqrt(l.snr / (1 + l.snr) / d_set->es());
    const std::size_t angles = d_set->size() > 256 ? 128 : 64;
    l.harmonic.assign(d_harmonics, std::vector<sample>(bins));
    std::vector<double> likelihood(angles), distance(d_set->size());
    for (std::size_t b = 0; b < bins; ++b) {
        const double radius = (static_cast<double>(b) + 0.5) / d_bins_per_rms;
        for (std::size_t q = 0; q < angles; ++q) {
            const complex at = std::polar(
                radius, 2 * M_PI * static_cast<double>(q) / static_cast<double>(angles) / d_rotations);
            double nearest = 1e300;
            for (std::size_t i = 0; i < distance.size(); ++i)
                nearest = std::min(nearest, distance[i] = std::norm(at - scale * d_set->points()[i]));
            double sum = 0;
            for (std::size_t i = 0; i < distance.size(); ++i)
                if (distance[i] < nearest + 20 * n0)
                    sum += d_set->priors()[i] * std::exp((nearest - distance[i]) / n0);
            likelihood[q] = std::log(sum) - nearest / n0;
        }
        for (unsigned h = 0; h < d_harmonics; ++h) {
            complex c{};
            for (std::size_t q = 0; q < angles; ++q)
                c += likelihood[q] *
                     std::polar(1.0,
                                -2 * M_PI * (h + 1) * static_cast<double>(q) / static_cast<double>(angles));
            l.harmonic[h][b] = sample(c * 2.0 / static_cast<double>(angles));
        }
    }
}

std::vector<blind_phase::candidate>
blind_phase::estimate(const sample* r, std::size_t count, std::size_t most)
{
    double energy_sum = 0, n = 0;
    for (std::size_t k = 0; k < count; ++k)
        if (usable(r[k])) {
            energy_sum += energy(r[k]);
            n += 1;
        }
    if (!(energy_sum > 0))
        return {};
    const double rms = std::sqrt(energy_sum / n);

    // Es/N0 from the radii alone.
    std::vector<std::uint8_t> bin(count);
    std::vector<double> histogram(bins);
    const auto to_bin = static_cast<float>(d_bins_per_rms / rms);
    for (std::size_t k = 0; k < count; ++k) {
        const float radius = usable(r[k]) ? std::sqrt(energy(r[k])) * to_bin : 0.0f;
        bin[k] = static_cast<std::uint8_t>(std::min(radius, static_cast<float>(bins - 1)));
        histogram[bin[k]] += 1;
    }
    level* chosen = nullptr;
    double highest = 0;
    for (auto& l : d_levels) {
        double sum = 0;
        for (std::size_t b = 0; b < bins; ++b)
            sum += histogram[b] * l.log_radius[b];
        if (!chosen || sum > highest) {
            chosen = &l;
            highest = sum;
        }
    }
    if (chosen->harmonic.empty())
        fill_harmonics(*chosen);

    // Sums over pieces so short that the fastest harmonic stands still within them.
    const double fastest = widest_frequency * d_rotations * d_harmonics;
    std::size_t piece = 1;
    while (piece < 128 && fastest * static_cast<double>(piece) < 0.1)
        piece *= 2;
    const std::size_t pieces = (count + piece - 1) / piece;
    std::vector<std::vector<sample>> sums(d_harmonics, std::vector<sample>(pieces));
    for (std::size_t k = 0; k < count; ++k) {
        if (!usable(r[k]) || energy(r[k]) == 0)
            continue;
        const sample base = power(r[k] / std::sqrt(energy(r[k])), d_rotations);
        sample turned = base;
        for (unsigned h = 0; h < d_harmonics; ++h, turned = times(turned, base))
            sums[h][k / piece] += times(chosen->harmonic[h][bin[k]], turned);
    }

    // The likelihood over frequency and phase; for each frequency its best phase.
    struct peak {
        double value, phase, frequency;
    };
    std::vector<complex> spectrum(d_harmonics);
    const std::size_t phases = 24 * d_harmonics;
    std::vector<complex> turns(phases);
    for (std::size_t q = 0; q < phases; ++q)
        turns[q] = std::polar(1.0, -2 * M_PI * static_cast<double>(q) / static_cast<double>(phases));
    const auto best_phase = [&](double f) {
        for (unsigned h = 0; h < d_harmonics; ++h) {
            const double turn = -2 * M_PI * f * (h + 1) * d_rotations * static_cast<double>(piece);
            const sample by(std::polar(1.0, turn));
            sample phasor(std::polar(1.0, turn * 0.5)); // the middle of a piece
            sample sum{};
            for (std::size_t j = 0; j < pieces; ++j, phasor = times(phasor, by))
                sum += times(sums[h][j], phasor);
            spectrum[h] = sum;
        }
        const auto value = [&](double phase) { // of the first harmonic
            double sum = 0;
            for (unsigned h = 0; h < d_harmonics; ++h)
                sum += (spectrum[h] * std::polar(1.0, -(h + 1) * phase)).real();
            return sum;
        };
        const double step = 2 * M_PI / static_cast<double>(phases);
        peak best{-1e300, 0, f};
        for (std::size_t q = 0; q < phases; ++q) {
            double v = 0;
            for (unsigned h = 0; h < d_harmonics; ++h) {
                const complex& turn = turns[(h + 1) * q % phases];
                v += spectrum[h].real() * turn.real() - spectrum[h].imag() * turn.imag();
            }
            if (v > best.value)
                best = {v, static_cast<double>(q) * step, f};
        }
        const double low = value(best.phase - step), high = value(best.phase + step),
                     bend = low - 2 * best.value + high;
        if (bend < 0)
            best.phase += std::clamp(0.5 * (low - high) / bend, -1.0, 1.0) * step;
        best.value = value(best.phase);
        best.phase /= d_rotations;
        return best;
    };
    const double step = 1 / (3.0 * static_cast<double>(count) * d_rotations * d_harmonics);
    const int steps = static_cast<int>(std::ceil(widest_frequency / step));
    std::vector<peak> peaks, tops;
    for (int i = -steps; i <= steps; ++i)
        peaks.push_back(best_phase(i * step));
    for (std::size_t i = 0; i < peaks.size(); ++i)
        if ((i == 0 || peaks[i].value >= peaks[i - 1].value) &&
            (i + 1 == peaks.size() || peaks[i].value > peaks[i + 1].value))
            tops.push_back(peaks[i]);
    std::sort(tops.begin(), tops.end(), [](const peak& a, const peak& b) { return a.value > b.value; });
    tops.resize(std::min(tops.size(), most));
    for (auto& top : tops)
        for (double width = step / 2; width > step / 40; width /= 2)
            for (double f : {top.frequency - width, top.frequency + width})
                if (const peak p = best_phase(f); p.value > top.value) {
                    top = p;
                    break;
                }

    std::vector<candidate> result;
    const double amplitude = rms * std::sqrt(chosen->snr / (1 + chosen->snr) / d_set->es());
    for (std::size_t i = 0; i < tops.size(); ++i)
        result.push_back({std::polar(amplitude, tops[i].phase), tops[i].frequency});
    return result;
}

} // namespace halfplane::link
