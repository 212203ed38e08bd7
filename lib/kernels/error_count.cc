// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/kernels/error_count.h"

#include "loops.h"

#include <algorithm>

namespace halfplane::kernels {

std::size_t
find_errors(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t count, std::uint32_t* where)
{
    return loops().find_errors(sent, decided, count, where);
}

void count_indices(const std::uint16_t* index, std::size_t count, std::uint64_t* histogram, std::size_t size)
{
    // One histogram would wait for its own last store whenever a value comes twice in a row.
    constexpr std::size_t ways = 4, small = 256;
    if (size > small || count < small) {
        for (std::size_t k = 0; k < count; ++k)
            ++histogram[index[k]];
        return;
    }
    std::uint32_t part[ways][small] = {};
    while (count > 0) {
        const std::size_t n = std::min<std::size_t>(count, 1u << 30);
        std::size_t k = 0;
        for (; k + ways <= n; k += ways)
            for (std::size_t w = 0; w < ways; ++w)
                ++part[w][index[k + w]];
        for (; k < n; ++k)
            ++part[0][index[k]];
        for (std::size_t i = 0; i < size; ++i)
            for (std::size_t w = 0; w < ways; ++w) {
                histogram[i] += part[w][i];
                part[w][i] = 0;
            }
        index += n, count -= n;
    }
}

namespace {
template <typename Word, typename Loop>
void add_errors(const Word* sent, const Word* decided, std::size_t count, label_errors& to, Loop loop)
{
    label_error_sums sums{};
    loop(sent, decided, count, sums);
    to.labels += count;
    to.wrong_labels += sums.wrong_labels;
    to.wrong_bits += sums.wrong_bits;
    to.wrong_bits_squared += sums.wrong_bits_squared;
    for (std::size_t bit = 0; bit < to.by_bit.size(); ++bit)
        to.by_bit[bit] += sums.by_bit[bit];
}
} // namespace

void count_label_errors(const std::uint16_t* sent,
                        const std::uint16_t* decided,
                        std::size_t count,
                        label_errors& to)
{
    add_errors(sent, decided, count, to, loops().count_label_errors_16);
}

void count_label_errors(const std::uint8_t* sent,
                        const std::uint8_t* decided,
                        std::size_t count,
                        label_errors& to)
{
    add_errors(sent, decided, count, to, loops().count_label_errors_8);
}

} // namespace halfplane::kernels
