// SPDX-License-Identifier: GPL-3.0-or-later
#include "gain_sampler.h"

#include "halfplane/kernels/noise.h"
#include "halfplane/kernels/random_words.h"
#include "streams.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <cstdlib>
#include <stdexcept>
#include <string>
#include <vector>

namespace halfplane {

namespace {

/// Finitely many states, by their cumulated probabilities in units of 2^-32.
class state_sampler final : public gain_sampler
{
public:
    explicit state_sampler(const std::vector<channel_state>& states)
    {
        double sum = 0;
        for (const channel_state& s : states)
            sum += s.probability;
        double up_to = 0;
        for (const channel_state& s : states) {
            up_to += s.probability / sum;
            d_limit.push_back(static_cast<std::uint64_t>(std::ldexp(up_to, 32)));
            d_gain.push_back(s.gain);
        }
        d_limit.back() = std::uint64_t{1} << 32;
    }
    void draw(std::uint64_t seed, std::uint64_t first, std::size_t count, double* gain) const override
    {
        std::vector<std::uint32_t> word(count);
        kernels::random_words(seed, streams::gain).draw(first, count, word.data());
        for (std::size_t k = 0; k < count; ++k) {
            std::size_t state = 0;
            while (word[k] >= d_limit[state])
                ++state;
            gain[k] = d_gain[state];
        }
    }

private:
    std::vector<std::uint64_t> d_limit;
    std::vector<double> d_gain;
};

/*!
 * Σ over the branches of |√(K/(K+1)) + CN(0, 1/(K+1))|²: Rician of factor K, Rayleigh at K = 0 (Simon and
 * Alouini, Digital Communication over Fading Channels, 2nd ed. 2005, section 2.2).
 */
class rician_sampler final : public gain_sampler
{
public:
    rician_sampler(double k, unsigned branches)
        : d_direct(std::sqrt(k / (k + 1))), d_scattered(1 / (k + 1)), d_branches(branches)
    {
    }
    void draw(std::uint64_t seed, std::uint64_t first, std::size_t count, double* gain) const override
    {
        std::vector<std::complex<float>> z(count);
        std::fill_n(gain, count, 0.0);
        for (unsigned b = 0; b < d_branches; ++b) {
            kernels::complex_noise(seed, streams::branch + b).draw(first, count, d_scattered, z.data());
            for (std::size_t k = 0; k < count; ++k)
                gain[k] += std::norm(std::complex<double>(z[k]) + d_direct);
        }
    }

private:
    double d_direct, d_scattered;
    unsigned d_branches;
};

/// Gamma of shape m·L and scale 1/m: Nakagami-m over L branches. G. Marsaglia and W. W. Tsang, ACM Trans.
/// Math. Softw. 26 (2000) 363; shapes below 1 by their note: shape + 1 times U^(1/shape).
class gamma_sampler final : public gain_sampler
{
public:
    gamma_sampler(double m, unsigned branches) : d_shape(m * branches), d_scale(1 / m) {}
    void draw(std::uint64_t seed, std::uint64_t first, std::size_t count, double* gain) const override
    {
        // A draw may need several tries; try t takes its numbers from streams of its own.
        const double shape = d_shape < 1 ? d_shape + 1 : d_shape;
        const double d = shape - 1.0 / 3, c = 1 / std::sqrt(9 * d);
        std::vector<std::complex<float>> normal(count);
        std::vector<std::uint32_t> word(count);
        std::vector<bool> done(count, false);
        std::size_t left = count;
        for (unsigned attempt = 0; left > 0; ++attempt) {
            kernels::complex_noise(seed, streams::branch + 2 * attempt)
                .draw(first, count, 2.0, normal.data());
            kernels::random_words(seed, streams::branch + 2 * attempt + 1).draw(first, count, word.data());
            for (std::size_t k = 0; k < count; ++k) {
                if (done[k])
                    continue;
                const double x = normal[k].real(), root = 1 + c * x, v = root * root * root;
                const double u = (word[k] + 0.5) * 0x1p-32;
                if (root <= 0 || std::log(u) >= x * x / 2 + d - d * v + d * std::log(v))
                    continue;
                gain[k] = d * v * d_scale;
                done[k] = true;
                --left;
            }
        }
        if (d_shape < 1) {
            kernels::random_words(seed, streams::gain).draw(first, count, word.data());
            for (std::size_t k = 0; k < count; ++k)
                gain[k] *= std::pow((word[k] + 0.5) * 0x1p-32, 1 / d_shape);
        }
    }

private:
    double d_shape, d_scale;
};

} // namespace

std::unique_ptr<gain_sampler> gain_sampler::of(const law& channel)
{
    const std::vector<channel_state>& states = channel.states();
    if (states.size() == 1 && states[0].gain == 1)
        return nullptr;
    if (!states.empty())
        return std::make_unique<state_sampler>(states);

    const std::string name = channel.name();
    const std::size_t star = name.find('*');
    const std::string one = name.substr(0, star);
    const unsigned branches = star == std::string::npos
                                  ? 1
                                  : static_cast<unsigned>(std::strtoul(name.c_str() + star + 1, nullptr, 10));
    const std::size_t colon = one.find(':');
    const std::string kind = one.substr(0, colon);
    const double parameter = colon == std::string::npos ? 0 : std::strtod(one.c_str() + colon + 1, nullptr);
    if (branches > 0 && kind == "rayleigh")
        return std::make_unique<rician_sampler>(0.0, branches);
    if (branches > 0 && kind == "rician")
        return std::make_unique<rician_sampler>(std::pow(10.0, parameter / 10), branches);
    if (branches > 0 && kind == "nakagami" && parameter > 0)
        return std::make_unique<gamma_sampler>(parameter, branches);
    throw std::invalid_argument("channel: no draws of the gain of law \"" + name + "\" are known");
}

} // namespace halfplane
