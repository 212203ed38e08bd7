// SPDX-License-Identifier: GPL-3.0-or-later
// block_counts: index of dispersion over block lengths, with two tests of significance.
#include "halfplane/block_counts.h"

#include <boost/math/special_functions/gamma.hpp>

#include <algorithm>

namespace halfplane {

void block_counts::add(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t n)
{
    for (std::size_t k = 0; k < n;) {
        const std::size_t end = k + std::min<std::size_t>(n - k, shortest - d_open_symbols);
        const std::size_t steps = end - k;
        std::uint64_t errors = 0;
        for (; k < end; ++k)
            errors += sent[k] != decided[k];
        add(steps, errors);
    }
}

/// No more steps than the block under way has room for.
void block_counts::add(std::uint64_t steps, std::uint64_t errors)
{
    d_open_symbols += steps;
    d_open_errors += errors;
    d_errors += errors;
    if (d_open_symbols == shortest) {
        close_block(d_open_errors);
        d_open_symbols = d_open_errors = 0;
    }
}

void block_counts::add_clear(std::uint64_t steps)
{
    const auto first = std::min<std::uint64_t>(steps, shortest - d_open_symbols);
    add(first, 0);
    steps -= first;
    close_clear(steps / shortest);
    add(steps % shortest, 0);
}

void block_counts::add_error()
{
    add(1, 1);
}

/// Two blocks of one length make one of the next, so a level costs half of the level below.
void block_counts::close_block(std::uint64_t errors, std::size_t length)
{
    for (; length < lengths; ++length) {
        auto& l = d_levels[length];
        ++l.blocks;
        l.errors += errors;
        l.squares += static_cast<long double>(errors) * static_cast<long double>(errors);
        l.waiting = !l.waiting;
        if (l.waiting) {
            l.half = errors;
            return;
        }
        errors += l.half;
    }
}

/// Any number of blocks without errors at once.
void block_counts::close_clear(std::uint64_t blocks)
{
    for (std::size_t length = 0; length < lengths && blocks > 0; ++length) {
        auto& l = d_levels[length];
        l.blocks += blocks;
        if (l.waiting) {
            l.waiting = false;
            --blocks;
            close_block(l.half, length + 1);
        }
        if (blocks % 2 == 1) {
            l.waiting = true;
            l.half = 0;
        }
        blocks /= 2;
    }
}

std::optional<double> block_counts::dispersion() const
{
    if (d_errors < least_errors)
        return std::nullopt;
    const auto heard =
        static_cast<std::size_t>(std::count_if(d_levels.begin(), d_levels.end(), [](const level& l) {
            return l.blocks >= least_blocks && l.errors >= least_errors;
        }));
    if (heard == 0)
        return std::nullopt;
    const double limit = significance / static_cast<double>(heard);
    double largest = 1;
    for (std::size_t k = 0; k < heard; ++k) {
        const auto& l = d_levels[k];
        const double blocks = static_cast<double>(l.blocks), length = static_cast<double>(shortest << k);
        const double errors = static_cast<double>(l.errors), mean = errors / blocks, rate = mean / length;
        if (rate >= 1)
            continue;
        const double squares = static_cast<double>(l.squares);
        const double index = (squares - errors * mean) / (mean * (1 - rate) * (blocks - 1));
        if (index <= largest)
            continue;
        const double pairs = (squares - errors) / 2;
        const double expected_pairs = errors * (errors - 1) / 2 * (length - 1) / (blocks * length - 1);
        const double chi_tail = boost::math::gamma_q((blocks - 1) / 2, index * (blocks - 1) / 2);
        const double pair_tail = pairs > 0 ? boost::math::gamma_p(pairs, expected_pairs) : 1;
        if (chi_tail < limit && pair_tail < limit)
            largest = index;
    }
    return largest;
}

} // namespace halfplane
