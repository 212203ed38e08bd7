// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/kernels/noise.h"

#include "loops.h"
#include "philox.h"

#include <cmath>
#include <stdexcept>
#include <string>

namespace halfplane::kernels {

namespace {
float amplitude(double n0)
{
    if (!(n0 >= 0) || !std::isfinite(n0))
        throw std::invalid_argument("complex_noise: n0 must be finite and not negative, not " +
                                    std::to_string(n0));
    return static_cast<float>(std::sqrt(n0));
}
} // namespace

complex_noise::complex_noise(std::uint64_t seed, std::uint64_t stream) : d_seed(seed), d_stream(stream) {}

void complex_noise::draw(std::uint64_t first, std::size_t count, double n0, std::complex<float>* out) const
{
    loops().noise(d_seed, d_stream, first, count, amplitude(n0), false, reinterpret_cast<float*>(out));
}

void complex_noise::add(std::uint64_t first, std::size_t count, double n0, std::complex<float>* out) const
{
    loops().noise(d_seed, d_stream, first, count, amplitude(n0), true, reinterpret_cast<float*>(out));
}

std::complex<double> complex_noise::reference(std::uint64_t k) const
{
    const auto low = [](std::uint64_t w) { return static_cast<std::uint32_t>(w); };
    const auto high = [](std::uint64_t w) { return static_cast<std::uint32_t>(w >> 32); };
    // Counter: the number of the pair, then the stream. The top bit of the first field marks the blocks of
    // fine bits.
    const std::uint64_t pair = k / 2;
    const auto coarse =
        philox::block({low(pair), high(pair), low(d_stream), high(d_stream)}, low(d_seed), high(d_seed));
    const std::uint32_t radius = coarse[k % 2 ? 2 : 0], angle = coarse[k % 2 ? 3 : 1];
    double u = (radius + 0.5) * 0x1p-32;
    if (radius < (1u << 20)) {
        const std::uint64_t tagged = k | (std::uint64_t{1} << 63);
        const auto fine = philox::block(
            {low(tagged), high(tagged), low(d_stream), high(d_stream)}, low(d_seed), high(d_seed));
        u = (radius * 0x1p32 + fine[0] + 0.5) * 0x1p-64;
    }
    const double r = std::sqrt(-std::log(u)), phi = 2 * M_PI * 0x1p-32 * static_cast<std::int32_t>(angle);
    return {r * std::cos(phi), r * std::sin(phi)};
}

} // namespace halfplane::kernels
