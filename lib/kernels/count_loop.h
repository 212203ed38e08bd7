// SPDX-License-Identifier: GPL-3.0-or-later
// count_loop: comparison and popcounts in lanes. Included once for each target.
#pragma once

#include "loops.h"

#include <cstddef>
#include <cstdint>

namespace halfplane::kernels {
namespace HALFPLANE_TARGET {

std::size_t
find_errors(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t count, std::uint32_t* where)
{
    constexpr std::size_t group = 32;
    std::size_t found = 0, k = 0;
    for (; k + group <= count; k += group) {
        std::uint16_t any = 0;
        for (std::size_t j = 0; j < group; ++j)
            any = static_cast<std::uint16_t>(any | (sent[k + j] ^ decided[k + j]));
        if (!any)
            continue;
        for (std::size_t j = 0; j < group; ++j) {
            where[found] = static_cast<std::uint32_t>(k + j);
            found += sent[k + j] != decided[k + j];
        }
    }
    for (; k < count; ++k)
        if (sent[k] != decided[k])
            where[found++] = static_cast<std::uint32_t>(k);
    return found;
}

namespace count_detail {
/// Bits set in each 16-bit lane, by halves (the tree of Wilkes, Wheeler and Gill, 1957).
inline std::uint16_t bits_of(std::uint16_t x)
{
    x = static_cast<std::uint16_t>(x - ((x >> 1) & 0x5555));
    x = static_cast<std::uint16_t>((x & 0x3333) + ((x >> 2) & 0x3333));
    x = static_cast<std::uint16_t>((x + (x >> 4)) & 0x0f0f);
    return static_cast<std::uint16_t>((x + (x >> 8)) & 0x1f);
}
} // namespace count_detail

template <typename Word>
void count_label_errors(const Word* sent, const Word* decided, std::size_t count, label_error_sums& to)
{
    using namespace count_detail;
    // 255 rounds keep a sum of 16² in a 16-bit lane.
    constexpr std::size_t lanes = 32, block = 255 * lanes;
    constexpr unsigned width = 8 * sizeof(Word);
    for (std::size_t start = 0; start < count; start += block) {
        const std::size_t n = count - start < block ? count - start : block, whole = n / lanes * lanes;
        std::uint16_t wrong[lanes] = {}, bits[lanes] = {}, squares[lanes] = {}, each[width][lanes] = {};
        const auto add = [&](std::size_t lane, std::size_t k) {
            const std::uint16_t x = static_cast<std::uint16_t>(sent[start + k] ^ decided[start + k]);
            const std::uint16_t h = bits_of(x);
            wrong[lane] = static_cast<std::uint16_t>(wrong[lane] + (x != 0));
            bits[lane] = static_cast<std::uint16_t>(bits[lane] + h);
            squares[lane] = static_cast<std::uint16_t>(squares[lane] + h * h);
        };
        for (std::size_t k = 0; k < whole; k += lanes) {
            std::uint16_t any = 0;
            for (std::size_t lane = 0; lane < lanes; ++lane)
                any = static_cast<std::uint16_t>(any | (sent[start + k + lane] ^ decided[start + k + lane]));
            if (!any)
                continue;
            for (std::size_t lane = 0; lane < lanes; ++lane)
                add(lane, k + lane);
            for (unsigned bit = 0; bit < width; ++bit)
                for (std::size_t lane = 0; lane < lanes; ++lane)
                    each[bit][lane] = static_cast<std::uint16_t>(
                        each[bit][lane] +
                        (((sent[start + k + lane] ^ decided[start + k + lane]) >> bit) & 1));
        }
        for (std::size_t k = whole; k < n; ++k) {
            add(k - whole, k);
            for (unsigned bit = 0; bit < width; ++bit)
                each[bit][k - whole] = static_cast<std::uint16_t>(
                    each[bit][k - whole] + (((sent[start + k] ^ decided[start + k]) >> bit) & 1));
        }
        for (std::size_t lane = 0; lane < lanes; ++lane) {
            to.wrong_labels += wrong[lane];
            to.wrong_bits += bits[lane];
            to.wrong_bits_squared += squares[lane];
            for (unsigned bit = 0; bit < width; ++bit)
                to.by_bit[bit] += each[bit][lane];
        }
    }
}

void count_label_errors_16(const std::uint16_t* sent,
                           const std::uint16_t* decided,
                           std::size_t count,
                           label_error_sums& to)
{
    count_label_errors(sent, decided, count, to);
}

void count_label_errors_8(const std::uint8_t* sent,
                          const std::uint8_t* decided,
                          std::size_t count,
                          label_error_sums& to)
{
    count_label_errors(sent, decided, count, to);
}

} // namespace HALFPLANE_TARGET
} // namespace halfplane::kernels
