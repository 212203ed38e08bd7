// SPDX-License-Identifier: GPL-3.0-or-later
// align_parity: long shift registers: decisions, three-term parity checks, solve, confirm, rank.
#include "align_blind.h"
#include "align_search.h"

#include "halfplane/kernels/detect.h"

#include <algorithm>
#include <array>

namespace halfplane::link {

namespace {

constexpr std::size_t candidates = 6; ///< of phase and frequency that are tried
/// Symbols after which a search looks, all it has; then it begins anew. The second look ends a doubt within
/// the hold-back even where a symbol carries one bit.
constexpr std::array<std::size_t, 4> looks = {2048, 3328, 8192, search::longest_look};
static_assert(looks.back() == search::longest_look);

constexpr unsigned confirmed_bits = 256, most_errors = 64;
/// Over the whole window, at least so many bits, and over the last quarter of as many, fewer errors than this
/// share.
constexpr std::uint64_t shortest_run = 3072;
constexpr double highest_rate = 0.3;
/// Ones among confirmed bits of the reference itself: six standard deviations about one half. Near the zero
/// state a register's output is almost all zeros and would agree with silence.
constexpr unsigned fewest_ones = 80, most_ones = 176;

/// Bits, first one first, readable 32 at a time from anywhere.
class bit_row
{
public:
    void assign(const std::vector<std::uint8_t>& bits, bool complement)
    {
        d_size = bits.size();
        d_words.assign(d_size / 64 + 2, 0);
        for (std::size_t k = 0; k < d_size; ++k)
            d_words[k / 64] |=
                std::uint64_t{static_cast<std::uint8_t>(bits[k] ^ static_cast<std::uint8_t>(complement))}
                << (63 - k % 64);
    }
    std::size_t size() const noexcept { return d_size; }
    std::uint32_t get(std::size_t at, unsigned count) const noexcept
    {
        const unsigned in = at % 64;
        std::uint64_t word = d_words[at / 64] << in;
        if (in)
            word |= d_words[at / 64 + 1] >> (64 - in);
        return static_cast<std::uint32_t>(word >> (64 - count));
    }

private:
    std::vector<std::uint64_t> d_words;
    std::size_t d_size = 0;
};

class parity_search final : public search
{
public:
    parity_search(reference& ref, const kernels::point_decider& decider)
        : d_ref(ref), d_decider(decider), d_blind(ref.set()),
          d_register(ref.known().stages(), ref.known().tap()),
          d_locator(ref.known().stages(), ref.known().tap()), d_line(on_a_line(ref.set()))
    {
        const unsigned width = ref.set().label_bits();
        d_window = std::clamp<std::size_t>(16384 / width, 2048, 8192);
        for (unsigned turn = 0; turn < d_blind.rotations(); ++turn) {
            std::vector<sample> turned;
            for (const auto& p : ref.set().points())
                turned.emplace_back(sample(p * std::polar(1.0, -2 * M_PI * turn / d_blind.rotations())));
            std::vector<std::uint16_t> image(turned.size());
            decider.decide(turned.data(), image.data(), turned.size());
            std::vector<std::uint16_t> labels;
            for (auto i : image)
                labels.push_back(ref.set().labels()[i]);
            d_labels.push_back(std::move(labels));
        }
    }

    void restart(std::uint64_t from) override
    {
        d_start = from;
        d_look = 0;
    }

    std::optional<finding> look(const ring<sample>& raw, std::uint64_t end) override
    {
        if (end - d_start < looks[d_look])
            return std::nullopt;
        const auto begin = end - std::min<std::uint64_t>(end - d_start, longest_look);
        const auto found = attempt(raw, begin, end);
        if (++d_look == looks.size())
            restart(end);
        return found;
    }

private:
    struct solution {
        double error_rate = 1;
        std::uint64_t content = 0, at = 0; ///< register content, and the bit of the window where it stands
        bool mirrored = false, inverted = false;
    };

    std::optional<finding> attempt(const ring<sample>& raw, std::uint64_t begin, std::uint64_t end)
    {
        const std::size_t count = end - begin, window = std::min(count, d_window);
        std::vector<sample> z(count);
        std::optional<solution> best;
        for (bool mirrored : {false, true}) {
            if (mirrored && d_line)
                break;
            for (std::size_t k = 0; k < count; ++k)
                z[k] = mirrored ? std::conj(raw[begin + k]) : raw[begin + k];
            for (const auto& c : d_blind.estimate(z.data(), count, candidates)) {
                decide(z, c, window);
                for (const auto& labels : d_labels)
                    if (auto s = solve(labels); s && (!best || s->error_rate < best->error_rate)) {
                        best = s; // of equals the plainer one, which comes first
                        best->mirrored = mirrored;
                    }
            }
        }
        if (!best)
            return std::nullopt;
        const std::uint64_t bit = *d_locator.position(best->content), modulus = d_ref.modulus();
        const std::uint64_t place = (bit + modulus - best->at % modulus) % modulus;
        return finding{{d_ref.offset(place, end - window), best->mirrored, best->inverted}, begin, end};
    }

    /*!
     * Decisions over the last `window` samples, the phase following them slowly: forward through the window,
     * then back through it from where the phase has settled.
     */
    void decide(const std::vector<sample>& z, const blind_phase::candidate& c, std::size_t window)
    {
        constexpr std::size_t stretch = 64;
        const std::size_t first = z.size() - window, stretches = (window + stretch - 1) / stretch;
        d_decided.resize(window);
        std::array<sample, stretch> y;
        double correction = 0;
        for (std::size_t pass = 0; pass < 2 * stretches; ++pass) {
            const std::size_t k = stretch * (pass < stretches ? pass : 2 * stretches - 1 - pass);
            const std::size_t n = std::min(stretch, window - k);
            sample phasor(
                std::polar(1.0, -2 * M_PI * c.frequency * static_cast<double>(first + k) - correction) /
                c.gain);
            const sample by(std::polar(1.0, -2 * M_PI * c.frequency));
            for (std::size_t i = 0; i < n; ++i, phasor = times(phasor, by))
                y[i] = usable(z[first + k + i]) ? times(z[first + k + i], phasor) : sample{};
            d_decider.decide(y.data(), &d_decided[k], n);
            sample along{};
            for (std::size_t i = 0; i < n; ++i) {
                if (d_decided[k + i] == kernels::point_decider::nonfinite)
                    d_decided[k + i] = 0;
                else
                    along += times_conj(y[i], d_ref.points()[d_decided[k + i]]);
            }
            if (along != sample{})
                correction += 0.15 * std::arg(complex(along));
        }
    }

    /// The register behind d_decided, should their labels be `labels` of the decided index.
    std::optional<solution> solve(const std::vector<std::uint16_t>& labels)
    {
        const unsigned width = d_ref.set().label_bits(), stages = d_register.stages();
        const std::size_t bits = d_decided.size() * width;
        d_bits.resize(bits);
        std::uint8_t* to = d_bits.data();
        for (auto i : d_decided) {
            const unsigned label = labels[i];
            for (unsigned k = width; k-- > 0;)
                *to++ = label >> k & 1;
        }

        // A three-term check fails at rate ½(1 − (1 − 2p)³) at bit error rate p, ½ on noise, and nearly
        // always where all bits are inverted.
        const unsigned tap = d_ref.known().tap();
        std::size_t failed = 0;
        for (std::size_t k = stages; k < bits; ++k)
            failed += d_bits[k] ^ d_bits[k - tap] ^ d_bits[k - stages];
        const double checks = static_cast<double>(bits - stages);
        const double off = static_cast<double>(failed) - checks / 2;
        if (std::abs(off) < 2.5 * std::sqrt(checks)) // five standard deviations
            return std::nullopt;
        const bool complement = off > 0;
        const bool inverted = complement != d_ref.known().inverted();
        if (inverted && !d_ref.can_invert())
            return std::nullopt; // a rotation says the same
        d_row.assign(d_bits, complement);

        for (std::size_t at = 0; at + stages + confirmed_bits <= bits; at += 4) {
            const std::uint64_t content = d_row.get(at, stages);
            if (content == 0)
                continue;
            unsigned errors = 0, ones = 0;
            d_register.set_content(content);
            d_register.take(stages);
            for (unsigned k = 0; k < confirmed_bits && errors <= most_errors; k += 32) {
                const std::uint32_t expected = d_register.take(32);
                ones += static_cast<unsigned>(__builtin_popcount(expected));
                errors +=
                    static_cast<unsigned>(__builtin_popcount(expected ^ d_row.get(at + stages + k, 32)));
            }
            if (errors > most_errors || ones < fewest_ones || ones > most_ones)
                continue;
            // A content with one wrong bit differs from the true one by a register that starts almost empty,
            // whose output stays sparse for a thousand bits and more: only the far end tells them apart.
            if (bits - at < shortest_run)
                break;
            std::uint64_t all_errors = 0, late_errors = 0, all = 0, late = 0;
            d_register.set_content(content);
            for (std::size_t k = at; k + 32 <= bits; k += 32) {
                const auto wrong =
                    static_cast<unsigned>(__builtin_popcount(d_register.take(32) ^ d_row.get(k, 32)));
                all += 32;
                all_errors += wrong;
                if (bits - k <= shortest_run / 4) {
                    late += 32;
                    late_errors += wrong;
                }
            }
            const double rate = static_cast<double>(all_errors) / static_cast<double>(all);
            if (rate < highest_rate &&
                static_cast<double>(late_errors) < highest_rate * static_cast<double>(late))
                return solution{rate, content, at, false, inverted};
        }
        return std::nullopt;
    }

    reference& d_ref;
    const kernels::point_decider& d_decider;
    blind_phase d_blind;
    shift_register d_register;
    register_locator d_locator;
    bool d_line;
    std::size_t d_window;
    std::vector<std::vector<std::uint16_t>> d_labels; ///< by rotation undone and index decided
    std::uint64_t d_start = 0;
    std::size_t d_look = 0;
    std::vector<std::uint16_t> d_decided;
    std::vector<std::uint8_t> d_bits;
    bit_row d_row;
};

} // namespace

std::unique_ptr<search> make_parity_search(reference& ref, const kernels::point_decider& decider)
{
    return std::make_unique<parity_search>(ref, decider);
}

} // namespace halfplane::link
