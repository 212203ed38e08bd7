// SPDX-License-Identifier: GPL-3.0-or-later
// residual_fit: sums merge; least squares by sweeping.
#include "halfplane/residuals.h"

#include <cmath>

namespace halfplane {

namespace {

constexpr double least_pivot = 1e-6; // of a column's power: below, earlier columns say the same

} // namespace

void residual_moments::merge(const residual_moments& later)
{
    symbols += later.symbols;
    power += later.power;
    fourth += later.fourth;
    square += later.square;
    turned += later.turned;
    turned_norm += later.turned_norm;
    signal_fourth += later.signal_fourth;
    pairs += later.pairs;
    lag_one += later.lag_one;
    lag_one_norm += later.lag_one_norm;
    blocks += later.blocks;
    block_powers += later.block_powers;
    stretches += later.stretches;
    radial_gain += later.radial_gain;
    tangential_gain += later.tangential_gain;
}

void residual_sums::merge(const residual_sums& later)
{
    d_symbols += later.d_symbols;
    for (std::size_t k = 0; k < d_gram.size(); ++k)
        d_gram[k] += later.d_gram[k];
    moments.merge(later.moments);
}

double residual_fit::strength(std::size_t c) const
{
    return known[c] ? std::norm(value[c]) / (n0 * inverse[c][c].real()) : 0;
}

/// The sweep operator on [Φ*Φ Φ*e; e*Φ e*e]: each swept column moves into the model and leaves the inverse,
/// the coefficients and what remains of Σ|e|².
std::optional<residual_fit> fit_residuals(const residual_sums& sums)
{
    constexpr std::size_t last = column::count, rows = residual_sums::rows;
    if (sums.symbols() < 8 * column::count)
        return std::nullopt;
    std::array<std::array<complex, rows>, rows> a;
    for (std::size_t j = 0; j < rows; ++j)
        for (std::size_t i = 0; i <= j; ++i) {
            a[i][j] = sums.product(i, j);
            a[j][i] = std::conj(a[i][j]);
        }
    residual_fit out{};
    out.symbols = sums.symbols();
    const auto n = static_cast<double>(sums.symbols());
    std::size_t swept = 0;
    const auto sweep = [&](std::size_t k) {
        const double whole = sums.product(k, k).real(), pivot = a[k][k].real();
        out.column_power[k] = whole / n;
        out.known[k] = pivot > least_pivot * whole && whole > least_pivot * n;
        if (!out.known[k])
            return;
        ++swept;
        for (std::size_t j = 0; j < rows; ++j)
            if (j != k)
                a[k][j] /= pivot;
        for (std::size_t i = 0; i < rows; ++i) {
            if (i == k)
                continue;
            const complex factor = a[i][k];
            for (std::size_t j = 0; j < rows; ++j)
                if (j != k)
                    a[i][j] -= factor * a[k][j];
            a[i][k] = -factor / pivot;
        }
        a[k][k] = 1 / pivot;
    };
    const auto is_neighbour = [](std::size_t k) {
        return k >= column::first_neighbour && k < column::compression;
    };
    for (std::size_t k = 0; k < last; ++k)
        if (!is_neighbour(k))
            sweep(k);
    const double without_neighbours = a[last][last].real();
    const std::size_t others = swept;
    for (std::size_t k = 0; k < last; ++k)
        if (is_neighbour(k))
            sweep(k);
    for (std::size_t i = 0; i < last; ++i) {
        if (!out.known[i])
            continue;
        out.value[i] = a[i][last];
        for (std::size_t j = 0; j < last; ++j)
            if (out.known[j])
                out.inverse[i][j] = a[i][j];
    }
    const double left = a[last][last].real();
    if (!(left > 0) || !std::isfinite(left))
        return std::nullopt;
    out.n0 = left / (n - static_cast<double>(swept));
    out.neighbours = swept - others;
    out.neighbour_strength = (without_neighbours - left) / out.n0;
    return out;
}

} // namespace halfplane
