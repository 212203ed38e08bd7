// SPDX-License-Identifier: GPL-3.0-or-later
// shift_register: jumps by powers of x modulo the characteristic polynomial, and the way back from content to
// position.
#include "halfplane/shift_register.h"

#include <stdexcept>
#include <string>

namespace halfplane {

const std::vector<o150_sequence>& o150_sequences()
{
    // ITU-T O.150 (05/96), clause 5, feedback stages and polarity; all of them from memory. Of the two
    // sequences of 20 stages in use this is the one with feedback from stages 3 and 20, not the one with 17
    // and 20 and suppressed runs of zeros.
    static const std::vector<o150_sequence> sequences = {
        {9, 5, false},
        {11, 9, false},
        {15, 14, true},
        {20, 3, false},
        {23, 18, true},
        {29, 27, true},
        {31, 28, true},
    };
    return sequences;
}

shift_register::shift_register(unsigned stages, unsigned tap) : d_stages(stages), d_tap(tap)
{
    if (stages < 2 || stages > 32)
        throw std::invalid_argument("a shift register has 2 to 32 stages, got " + std::to_string(stages));
    if (tap < 1 || tap >= stages)
        throw std::invalid_argument("the second tap lies at stage 1 to " + std::to_string(stages - 1) +
                                    ", got " + std::to_string(tap));
    d_mask = (1ull << stages) - 1;
    d_content = d_mask;
}

void shift_register::seek(std::uint64_t position) noexcept
{
    // The bits a_k, a_{k+1}, … are linear in the first n bits, with the coefficients of x^k mod c(x),
    // c(x) = x^n + x^{n−tap} + 1 from a_{k+n} = a_{k+n−tap} + a_k. The first n bits all being one, a_k is the
    // parity of these coefficients.
    const unsigned n = d_stages;
    const std::uint64_t fold = 1ull << (n - d_tap) | 1;
    const auto times_x = [&](std::uint64_t p) {
        p <<= 1;
        return p >> n ? (p & d_mask) ^ fold : p;
    };
    const auto product = [&](std::uint64_t p, std::uint64_t q) {
        std::uint64_t sum = 0;
        for (; q; q >>= 1, p = times_x(p))
            if (q & 1)
                sum ^= p;
        return sum;
    };

    std::uint64_t power = 1;
    std::uint64_t square = 2;
    for (position %= d_mask; position; position >>= 1, square = product(square, square))
        if (position & 1)
            power = product(power, square);

    d_content = 0;
    for (unsigned i = 0; i < n; ++i, power = times_x(power))
        d_content = d_content << 1 | static_cast<unsigned>(__builtin_parityll(power));
}

register_locator::register_locator(unsigned stages, unsigned tap) : d_stages(stages)
{
    shift_register r(stages, tap);
    d_period = r.period();
    d_stride = 1ull << (stages + 1) / 2;
    d_baby.reserve(d_stride);
    for (std::uint64_t k = 0; k < d_stride && k < d_period; ++k) {
        d_baby.emplace(r.content(), static_cast<std::uint32_t>(k));
        r.take(1);
    }
    d_giant.resize(stages);
    for (unsigned bit = 0; bit < stages; ++bit) {
        r.set_content(1ull << bit);
        std::uint64_t left = d_stride;
        for (; left >= 32; left -= 32)
            r.take(32);
        r.take(static_cast<unsigned>(left));
        d_giant[bit] = r.content();
    }
}

std::optional<std::uint64_t> register_locator::position(std::uint64_t content) const
{
    content &= d_period; // the period's ones are the mask of the register
    if (content == 0)
        return std::nullopt;
    for (std::uint64_t giant = 0; giant <= d_period; giant += d_stride) {
        if (const auto found = d_baby.find(content); found != d_baby.end())
            return (found->second + d_period - giant % d_period) % d_period;
        std::uint64_t moved = 0;
        for (unsigned bit = 0; bit < d_stages; ++bit)
            if (content >> bit & 1)
                moved ^= d_giant[bit];
        content = moved;
    }
    return std::nullopt; // only where the polynomial is not primitive
}

} // namespace halfplane
