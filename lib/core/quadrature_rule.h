// SPDX-License-Identifier: GPL-3.0-or-later
// quadrature_rule: nodes and weights of Gauss–Legendre rules on [0, 1], computed once.
#pragma once

#include <array>
#include <cmath>

namespace halfplane {

/// N-point Gauss–Legendre rule mapped to [0, 1].
template <int N>
struct quadrature_rule {
    std::array<double, N> node{}, weight{};

    quadrature_rule()
    {
        // Newton on the Legendre polynomial from Tricomi's starting values, in long double so that rounding
        // to double is the only error left.
        const long double pi = std::acos(-1.0L);
        for (int k = 0; k < N; ++k) {
            long double x = std::cos(pi * (k + 0.75L) / (N + 0.5L));
            long double slope = 0;
            for (int round = 0; round < 100; ++round) {
                long double p = 1, before = 0;
                for (int j = 1; j <= N; ++j) {
                    const long double next = ((2 * j - 1) * x * p - (j - 1) * before) / j;
                    before = p;
                    p = next;
                }
                slope = N * (x * p - before) / (x * x - 1);
                const long double step = p / slope;
                x -= step;
                if (std::abs(step) < 1e-18L)
                    break;
            }
            node[k] = static_cast<double>((1 - x) / 2);
            weight[k] = static_cast<double>(1 / ((1 - x * x) * slope * slope));
        }
    }

    static const quadrature_rule& get()
    {
        static const quadrature_rule rule;
        return rule;
    }
};

} // namespace halfplane
