// SPDX-License-Identifier: GPL-3.0-or-later
// residuals: sums over e_k = r_k − s_k from which the causes of errors are told apart, and their regression.
#pragma once

#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"

#include <array>
#include <complex>
#include <cstddef>
#include <cstdint>
#include <optional>
#include <vector>

namespace halfplane {

/*!
 * The regression: e_k = Σ β_c·φ_c(k) + noise. Samples and points are divided by √Es first, so that
 * coefficients are ratios. Columns φ in order: s_k; 1; s*_k; s_{k−4} … s_{k−1}; s_{k+1} … s_{k+4}; s_k(|s_k|²
 * − κ) with κ = E|s|⁴ at unit Es, which makes the last one orthogonal to the first.
 */
namespace column {
constexpr std::size_t gain = 0, offset = 1, image = 2, first_neighbour = 3, compression = 11, count = 12;
constexpr int reach = 4; ///< symbols before and after that may disturb

/// Column of s_{k+lag}, 1 ≤ |lag| ≤ reach.
constexpr std::size_t neighbour(int lag)
{
    return first_neighbour + static_cast<std::size_t>(lag < 0 ? lag + reach : lag + reach - 1);
}
} // namespace column

/*!
 * Second and fourth moments of ê = e − Σ β̂_c·φ_c with a β̂ that was fitted before, rotated so that the gain is
 * real. Divided by √Es.
 */
struct residual_moments {
    std::uint64_t symbols = 0;
    double power = 0;   ///< Σ|ê|²
    double fourth = 0;  ///< Σ|ê|⁴
    complex square = 0; ///< Σê², 0 on average where noise is circular; not rotated
    complex turned = 0; ///< Σ(ê·s*)²: its real part is radial less tangential power, weighted by |s|²
    double turned_norm = 0;   ///< Σ|ê·s*|⁴
    double signal_fourth = 0; ///< Σ|1 + β̂_0|²|s|⁴
    std::uint64_t pairs = 0;
    complex lag_one = 0;     ///< Σ ê_k·ê*_{k−1} over `pairs`
    double lag_one_norm = 0; ///< Σ|ê_k|²|ê_{k−1}|²
    std::uint64_t blocks = 0;
    double block_powers = 0; ///< Σ over blocks of (Σ|ê|²)²
    std::uint64_t stretches = 0;
    /// Σ over stretches of (Re Σ ê·s*)², and of Im, each over its variance where the gain is steady: by the
    /// stretch's own noise power and the error of β̂_0
    double radial_gain = 0, tangential_gain = 0;

    void merge(const residual_moments& later);
    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("symbols", symbols);
        a("power", power);
        a("fourth", fourth);
        a("square", square);
        a("turned", turned);
        a("turned_norm", turned_norm);
        a("signal_fourth", signal_fourth);
        a("pairs", pairs);
        a("lag_one", lag_one);
        a("lag_one_norm", lag_one_norm);
        a("blocks", blocks);
        a("block_powers", block_powers);
        a("stretches", stretches);
        a("radial_gain", radial_gain);
        a("tangential_gain", tangential_gain);
    }
};

/// Sufficient sums of the explained symbols of a stretch of stream; merging adds.
class residual_sums
{
public:
    static constexpr std::size_t rows = column::count + 1; ///< the columns and e itself

    std::uint64_t symbols() const noexcept { return d_symbols; }
    void merge(const residual_sums& later);
    /// Σ φ_i*·φ_j, i ≤ j; e is column::count.
    complex product(std::size_t i, std::size_t j) const { return d_gram[place(i, j)]; }

    residual_moments moments;
    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("moments", moments);
        a("symbols", d_symbols);
        a("gram", d_gram);
    }

private:
    friend class residual_gatherer;
    static constexpr std::size_t place(std::size_t i, std::size_t j) { return j * (j + 1) / 2 + i; }
    std::uint64_t d_symbols = 0;
    std::array<complex, rows*(rows + 1) / 2> d_gram{};
};

/// Least squares of e on the columns that the symbols sent can tell apart.
struct residual_fit {
    std::uint64_t symbols;
    std::array<bool, column::count> known;      ///< false: a combination of earlier columns (s* on a line of
                                                ///< points, s|s|² on a circle), left out
    std::array<complex, column::count> value{}; ///< β, 0 where not known
    std::array<std::array<complex, column::count>, column::count> inverse{}; ///< of Σ φ_i*·φ_j
    std::array<double, column::count> column_power{};                        ///< mean |φ|²
    double n0;                  ///< noise power over Es, Σ|ê|²/(n − columns)
    std::size_t neighbours = 0; ///< how many of their columns are known
    double neighbour_strength =
        0; ///< what they all take of Σ|e|², over n0: Gamma(neighbours, 1) where none is

    /// |β|² over its expectation where the true β is 0: exponential of mean 1 then.
    double strength(std::size_t c) const;
};

/// Nothing with fewer than 8 symbols a column, or without noise.
std::optional<residual_fit> fit_residuals(const residual_sums& sums);

/*!
 * Looks at stretches of consecutive symbols, one in each `period`, at places drawn by a fixed generator so
 * that nothing periodic hides; a stretch needs every reference and only finite samples, else it starts anew.
 * The moments use the regression of what came before; it is made anew whenever the sums have grown by a
 * sixteenth, so that it does not depend on how the stream is cut into windows. Moments begin after
 * `first_fit` symbols.
 */
class residual_gatherer
{
public:
    static constexpr std::size_t stretch = 512, period = 4096, block = 64;
    static constexpr std::uint64_t first_fit = 1024;

    explicit residual_gatherer(const signal_set& set);
    /// \param reference index sent, below the set's size, or negative for an excluded symbol
    void add(const std::complex<float>* in, const reference_t* reference, std::size_t n);
    /// What was gathered since the last call.
    residual_sums take();

private:
    void draw_place();
    void close_stretch();
    struct layout;
    void add_products(const layout& at);
    void add_moments(const layout& at);

    std::vector<complex> d_points; // divided by √Es
    double d_scale, d_kappa;
    std::uint64_t d_random = 0x9e3779b97f4a7c15u;
    std::size_t d_before = 0, d_after = 0; // symbols to pass before the stretch, and after it
    std::vector<complex> d_received, d_sent;
    residual_sums d_all, d_new;
    residual_sums d_stretch;
    std::uint64_t d_next_fit = first_fit;
    std::optional<residual_fit> d_model;
};

} // namespace halfplane
