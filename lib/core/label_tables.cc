// SPDX-License-Identifier: GPL-3.0-or-later
// label_tables: the searched labels of cross:32, and the rule that carries them to the larger cross sets.
#include "label_tables.h"

#include <array>
#include <cmath>

namespace halfplane::detail {

namespace {

/*
 * Made by `label_search cross:32 20 1 40 20000` (target label_search of this folder): exact BER at Es/N0 = 20
 * dB 5.4801e-4, where a Gray labelling, were there one, would have SER/5 = 5.0850e-4 and the usual folded
 * rectangle (J. G. Smith, IEEE Trans. Commun. 23 (1975) 385) has 5.8710e-4. Seed 2 ends at the same BER.
 */
constexpr std::array<label_t, 32> cross_32{27, 11, 15, 31, 29, 25, 3,  7,  23, 19, 13, 9,  1,  5,  21, 17,
                                           12, 8,  0,  4,  20, 16, 28, 24, 2,  6,  22, 18, 26, 10, 14, 30};

/// Places of a cross set by row from the lower left: the side's length and the index of (row, column), −1 in
/// a corner.
struct cross_grid {
    int side;
    std::vector<int> index;

    explicit cross_grid(std::size_t size)
        : side(6 * static_cast<int>(std::lround(std::sqrt(static_cast<double>(size) / 32)))),
          index(static_cast<std::size_t>(side * side), -1)
    {
        const auto outer = [&](int k) { return k < side / 6 || k >= side - side / 6; };
        int next = 0;
        for (int r = 0; r < side; ++r)
            for (int c = 0; c < side; ++c)
                if (!(outer(r) && outer(c)))
                    index[static_cast<std::size_t>(r * side + c)] = next++;
    }
    int at(int row, int column) const { return index[static_cast<std::size_t>(row * side + column)]; }
};

} // namespace

/*
 * A cross of 4M points is a cross of M blocks of 2 × 2. Every block takes the smaller set's label and two
 * bits of its own, mirrored from block to block: then only steps between blocks can cost more than one bit,
 * and they cost what they do in the smaller set. Steps over a border of blocks double in number where all
 * steps become four times as many, so the excess over Gray halves with each size; annealing from this start
 * finds nothing better.
 */
std::vector<label_t> cross_labels(std::size_t size)
{
    if (size == cross_32.size())
        return {cross_32.begin(), cross_32.end()};
    const auto coarse_labels = cross_labels(size / 4);
    const cross_grid fine(size), coarse(size / 4);
    std::vector<label_t> labels(size);
    for (int r = 0; r < fine.side; ++r)
        for (int c = 0; c < fine.side; ++c) {
            if (fine.at(r, c) < 0)
                continue;
            const auto block = static_cast<std::size_t>(coarse.at(r / 2, c / 2));
            const int column_bit = (c + c / 2) % 2, row_bit = (r + r / 2) % 2;
            labels[static_cast<std::size_t>(fine.at(r, c))] =
                static_cast<label_t>(coarse_labels[block] << 2 | column_bit << 1 | row_bit);
        }
    return labels;
}

} // namespace halfplane::detail
