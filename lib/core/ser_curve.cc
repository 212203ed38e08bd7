// SPDX-License-Identifier: GPL-3.0-or-later
// ser_curve: Chebyshev interpolation of ln SER in panels of one decibel.
#include "halfplane/ser_curve.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

constexpr double pi = 3.141592653589793;

/// Clenshaw's recurrence for Σ c_k T_k(t).
template <std::size_t n>
double chebyshev_sum(const std::array<double, n>& c, double t)
{
    double b1 = 0, b2 = 0;
    for (std::size_t k = n - 1; k > 0; --k) {
        const double b0 = c[k] + 2 * t * b1 - b2;
        b2 = b1;
        b1 = b0;
    }
    return c[0] + t * b1 - b2;
}

/// Coefficients of the derivative with respect to t: c'_{k−1} = c'_{k+1} + 2k·c_k, the first halved.
template <std::size_t n>
std::array<double, n> derivative(const std::array<double, n>& c)
{
    std::array<double, n> d{};
    for (std::size_t k = n - 1; k > 0; --k)
        d[k - 1] = (k + 1 < n ? d[k + 1] : 0) + 2 * static_cast<double>(k) * c[k];
    d[0] /= 2;
    return d;
}

} // namespace

const ser_curve::panel& ser_curve::coefficients(int floor_db) const
{
    if (const auto known = d_panels.find(floor_db); known != d_panels.end())
        return known->second;
    panel values{}, c{};
    for (std::size_t j = 0; j < nodes; ++j) {
        const double t = std::cos(pi * (static_cast<double>(j) + 0.5) / nodes);
        values[j] = d_source.ln_ser(from_db(floor_db + (t + 1) / 2));
    }
    for (std::size_t k = 0; k < nodes; ++k) {
        for (std::size_t j = 0; j < nodes; ++j)
            c[k] +=
                values[j] * std::cos(pi * static_cast<double>(k) * (static_cast<double>(j) + 0.5) / nodes);
        c[k] *= (k == 0 ? 1.0 : 2.0) / nodes;
    }
    return d_panels.emplace(floor_db, c).first->second;
}

ser_curve::value ser_curve::at(double es_n0_db) const
{
    const double db = std::clamp(es_n0_db, lowest_db, highest_db);
    const int floor_db = static_cast<int>(std::min(std::floor(db), highest_db - 1));
    const auto& c = coefficients(floor_db);
    const double t = 2 * (db - floor_db) - 1; // dt/d dB = 2
    const auto first = derivative(c);
    return {chebyshev_sum(c, t), 2 * chebyshev_sum(first, t), 4 * chebyshev_sum(derivative(first), t)};
}

} // namespace halfplane
