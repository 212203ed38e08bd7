// SPDX-License-Identifier: GPL-3.0-or-later
// align_correlation: blocks of samples against every delay of the period, by Fourier transforms.
#include "align_fft.h"
#include "align_search.h"

#include <algorithm>
#include <array>

namespace halfplane::link {

namespace {

/// Coherent within a block, magnitudes only across blocks: at 1e-4 cycles a symbol a block turns by 0.2
/// cycles, which costs 0.6 dB.
constexpr std::size_t block = 2048;
constexpr std::size_t most_blocks = search::longest_look / block;
constexpr std::size_t transform = 4 * block;
/// Delays that one transform yields free of wrap-around.
constexpr std::size_t reach = transform - block;
/// Spectra of the reference are kept up to this period, computed afresh beyond.
constexpr std::uint64_t longest_kept = std::uint64_t{1} << 20;

/// Chance that noise alone reaches T in one delay: a sum of B exponential variables of mean 1.
double noise_tail(double t, unsigned blocks)
{
    double term = 1, sum = 1;
    for (unsigned k = 1; k < blocks; ++k)
        sum += term *= t / k;
    return sum * std::exp(-t);
}

class correlation_search final : public search
{
public:
    explicit correlation_search(reference& ref)
        : d_ref(ref), d_fft(transform), d_period(ref.modulus()), d_work(transform), d_spectrum(transform)
    {
        for (bool inverted : {false, true})
            for (bool mirrored : {false, true})
                if (!(inverted && !ref.can_invert()) && !(mirrored && on_a_line(ref.set())))
                    d_hypotheses.push_back({mirrored, inverted, std::vector<float>(d_period)});

        std::vector<std::uint16_t> indices(d_period);
        ref.known().indices(0, d_period, indices.data());
        for (bool inverted : {false, true}) {
            if (inverted && !ref.can_invert())
                break;
            complex mean{};
            double energy = 0;
            for (auto i : indices) {
                const complex s = ref.set().points()[inverted ? ref.complement(i) : i];
                mean += s;
                energy += std::norm(s);
            }
            mean /= static_cast<double>(d_period);
            d_energy[inverted] = energy / static_cast<double>(d_period) - std::norm(mean);
            d_mean[inverted] = sample(mean);
            // A pattern of one point alone holds nothing to lock on.
            d_silent = d_silent || d_energy[inverted] <= 1e-9 * energy / static_cast<double>(d_period);
        }

        // In 1e9 symbols of noise 4.9e5 blocks are looked at: fewer than 1e-6 findings, before verification.
        const double candidates = static_cast<double>(d_period) * static_cast<double>(d_hypotheses.size());
        for (unsigned b = 1; b <= most_blocks; ++b) {
            double low = 1, high = 1000;
            for (int i = 0; i < 60; ++i)
                (noise_tail((low + high) / 2, b) * candidates * 4.9e5 > 1e-6 ? low : high) = (low + high) / 2;
            // Another pattern of the same short period repeats whatever it has in common with this one, so
            // only one period's worth of symbols is evidence: 1 − (1 − ρ²)^(n−1) is the law of a chance
            // correlation.
            const double n = std::min(static_cast<double>(b * block), static_cast<double>(d_period));
            const double rho2 = n > 1 ? 1 - std::pow(1e-7 / candidates, 1 / (n - 1)) : 2;
            d_threshold[b] = std::max(high, rho2 * static_cast<double>(b * block));
        }
        restart(0);
    }

    void restart(std::uint64_t from) override
    {
        d_start = d_next = from;
        for (auto& h : d_hypotheses)
            std::fill(h.evidence.begin(), h.evidence.end(), 0.0f);
    }

    std::optional<finding> look(const ring<sample>& raw, std::uint64_t end) override
    {
        std::optional<finding> found;
        while (!d_silent && end - d_next >= block && !found) {
            if (d_next - d_start == most_blocks * block)
                restart(d_next);
            add_block(raw);
            d_next += block;
            found = best();
        }
        return found;
    }

private:
    struct hypothesis {
        bool mirrored, inverted;
        std::vector<float> evidence; ///< by place of symbol d_start: Σ over blocks of n·ρ²
    };

    void add_block(const ring<sample>& raw)
    {
        // One spike must not outshout two thousand symbols: nothing counts for more than 12 dB above the
        // strong ones.
        std::vector<float> energies;
        sample sum{};
        for (std::uint64_t k = d_next; k < d_next + block; ++k)
            if (usable(raw[k]))
                energies.push_back(energy(raw[k]));
        if (energies.size() < block / 2)
            return;
        const auto strong = energies.begin() + static_cast<std::ptrdiff_t>(energies.size() * 9 / 10);
        std::nth_element(energies.begin(), strong, energies.end());
        const float limit = 16 * *strong;
        for (std::size_t k = 0; k < block; ++k) {
            const sample r = raw[d_next + k];
            d_work[k] = !usable(r) ? sample{} : energy(r) > limit ? r * std::sqrt(limit / energy(r)) : r;
            sum += d_work[k];
        }
        const sample mean = sum / static_cast<float>(block);
        double received = 0, with_mean = 0;
        for (std::size_t k = 0; k < block; ++k) {
            with_mean += energy(d_work[k]);
            d_work[k] = usable(raw[d_next + k]) ? d_work[k] - mean : sample{};
            received += energy(d_work[k]);
        }
        if (!(received > 1e-9 * with_mean))
            return; // silence, or a constant up to rounding
        std::fill(d_work.begin() + block, d_work.end(), sample{});
        d_fft.transform(d_work.data());
        d_received = d_work;

        const std::uint64_t shift = (d_next - d_start) % d_period;
        for (std::uint64_t first = 0; first < d_period; first += reach) {
            const std::size_t count = std::min<std::uint64_t>(reach, d_period - first);
            for (auto& h : d_hypotheses) {
                const sample* g = spectrum(first, h.inverted);
                if (h.mirrored) // the transform of the conjugate is the conjugate, read backward
                    for (std::size_t k = 0; k < transform; ++k)
                        d_work[k] = std::conj(times(d_received[(transform - k) % transform], g[k]));
                else
                    for (std::size_t k = 0; k < transform; ++k)
                        d_work[k] = times_conj(d_received[k], g[k]);
                d_fft.transform(d_work.data());
                const double norm = static_cast<double>(transform) * static_cast<double>(transform);
                const auto scale = static_cast<float>(1 / (norm * received * d_energy[h.inverted]));
                std::uint64_t place = (first + d_period - shift) % d_period;
                for (std::size_t i = 0; i < count; ++i) {
                    h.evidence[place] += scale * energy(d_work[i]);
                    if (++place == d_period)
                        place = 0;
                }
            }
        }
    }

    /// Transform of the reference from `first` on, its mean taken out.
    const sample* spectrum(std::uint64_t first, bool inverted)
    {
        auto& kept = d_kept[inverted];
        const std::size_t number = first / reach;
        if (d_period <= longest_kept && number < kept.size())
            return kept[number].data();
        std::vector<std::uint16_t> indices(transform);
        d_ref.known().indices(first, transform, indices.data());
        for (std::size_t k = 0; k < transform; ++k)
            d_spectrum[k] =
                d_ref.points()[inverted ? d_ref.complement(indices[k]) : indices[k]] - d_mean[inverted];
        d_fft.transform(d_spectrum.data());
        if (d_period > longest_kept)
            return d_spectrum.data();
        kept.push_back(d_spectrum);
        return kept.back().data();
    }

    std::optional<finding> best() const
    {
        const auto blocks = static_cast<unsigned>((d_next - d_start) / block);
        const hypothesis* winner = nullptr;
        std::uint64_t place = 0;
        float most = 0;
        for (const auto& h : d_hypotheses) {
            const auto top = std::max_element(h.evidence.begin(), h.evidence.end());
            if (*top > most * 1.0001f) { // of equals the plainer one, which comes first
                most = *top;
                winner = &h;
                place = static_cast<std::uint64_t>(top - h.evidence.begin());
            }
        }
        if (!winner || most < d_threshold[blocks])
            return std::nullopt;
        return finding{{d_ref.offset(place, d_start), winner->mirrored, winner->inverted}, d_start, d_next};
    }

    reference& d_ref;
    fft d_fft;
    std::uint64_t d_period, d_start = 0, d_next = 0;
    std::vector<sample> d_work, d_received, d_spectrum;
    std::vector<hypothesis> d_hypotheses;
    std::array<std::vector<std::vector<sample>>, 2> d_kept;
    std::array<double, 2> d_energy{};
    std::array<sample, 2> d_mean{};
    std::array<double, most_blocks + 1> d_threshold{};
    bool d_silent = false;
};

} // namespace

std::unique_ptr<search> make_correlation_search(reference& ref)
{
    return std::make_unique<correlation_search>(ref);
}

} // namespace halfplane::link
