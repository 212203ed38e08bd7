// SPDX-License-Identifier: GPL-3.0-or-later
// noise_shape: Gaussian noise that is not circular, and the detector that knows it or does not.
#pragma once

namespace halfplane {

/// What the detector takes for distance.
enum class metric {
    matched, ///< it knows the covariance: distances in the whitened plane
    nearest, ///< it does not: plain Euclidean distances
};

/*!
 * Covariance of the noise in (i, q) up to a factor; only its shape counts, since N0 = E|n|² comes from Es/N0.
 * Circular is {1, 0, 1}; white noise under a quadrature gain error of g has {1, 0, g²}.
 */
struct noise_shape {
    double ii = 1, iq = 0, qq = 1;
    metric decision = metric::matched;

    bool circular() const noexcept { return iq == 0 && ii == qq; }
};

} // namespace halfplane
