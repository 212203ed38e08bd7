// SPDX-License-Identifier: GPL-3.0-or-later
// label_tables: labels of cross sets from the rectangular Gray grid whose ends are folded up and down.
#include "label_tables.h"

#include "families.h"

#include <cmath>

namespace halfplane::detail {

/*
 * The 2:1 rectangle of `size` points has a Gray labelling. Its leftmost and rightmost columns, one corner
 * wide each, are moved above and below (J. G. Smith, "Odd-bit quadrature amplitude-shift keying", IEEE Trans.
 * Commun. 23 (1975) 385, from memory), which leaves few neighbours more than one bit apart.
 */
std::vector<label_t> cross_labels(std::size_t size)
{
    const int corner = static_cast<int>(std::lround(std::sqrt(static_cast<double>(size) / 32)));
    const int side = 6 * corner, columns = 8 * corner, rows = 4 * corner;
    const unsigned row_bits = bits_for(static_cast<std::size_t>(rows));
    const auto outer = [&](int k) { return k < corner || k >= side - corner; };
    std::vector<label_t> labels;
    for (int r = 0; r < side; ++r)
        for (int c = 0; c < side; ++c) {
            if (outer(r) && outer(c))
                continue;
            int row = r - corner, column = c + corner; // place in the rectangle
            if (row < 0 || row >= rows) {              // below or above: from the end of the same side
                const bool right = c >= side / 2;
                const int depth = row < 0 ? -1 - row : row - rows;            // 0 next to the rectangle
                const int along = right ? side - corner - 1 - c : c - corner; // 0 at the outer end
                column = right ? columns - 1 - (corner - 1 - depth) : corner - 1 - depth;
                row = row < 0 ? rows / 2 - 1 - along : rows / 2 + along;
            }
            labels.push_back(static_cast<label_t>(gray(static_cast<unsigned>(column)) << row_bits |
                                                  gray(static_cast<unsigned>(row))));
        }
    return labels;
}

} // namespace halfplane::detail
