// SPDX-License-Identifier: GPL-3.0-or-later
// fading_laws: Nakagami-m (Rayleigh is m = 1) and Rician tails and densities.
#include "halfplane/law.h"

#include <boost/math/special_functions/bessel.hpp>

#include <cmath>
#include <sstream>
#include <stdexcept>

namespace halfplane {

namespace {

std::string shown(const char* what, double x)
{
    std::ostringstream text;
    text << what << x;
    return text.str();
}

/// ln of exp(−z)·I_v(z), z > 0.
double ln_scaled_bessel(double v, double z)
{
    if (z < 700)
        return std::log(boost::math::cyl_bessel_i(v, z)) - z;
    // Hankel's series (DLMF 10.40.1): at z ≥ 700 and v < 64 its terms fall from the start or soon after.
    double term = 1, sum = 1;
    for (int k = 1; k < 200 && std::abs(term) > 1e-17 * std::abs(sum); ++k) {
        term *= -(4 * v * v - (2.0 * k - 1) * (2.0 * k - 1)) / (8 * z * k);
        sum += term;
    }
    return std::log(sum) - 0.5 * std::log(6.283185307179586 * z);
}

} // namespace

nakagami::nakagami(double m) : d_m(m)
{
    if (!(m >= least_m && m <= greatest_m))
        throw std::invalid_argument(shown("m of the Nakagami law must lie between 0.5 and 1e9, got ", m));
}

std::string nakagami::name() const
{
    return shown("nakagami:", d_m);
}

double nakagami::tail(double u) const
{
    return std::exp(ln_tail(u));
}

double nakagami::ln_tail(double u) const
{
    return -d_m * std::log1p(u / d_m);
}

double nakagami::density(double g, unsigned branches) const
{
    // m·g is gamma distributed with shape m·L. Around its mean the terms are large and cancel, so each is
    // taken relative to that mean and Stirling's remainder is left over.
    const double shape = d_m * branches, x = d_m * g;
    if (shape < 50)
        return d_m * std::exp((shape - 1) * std::log(x) - x - std::lgamma(shape));
    const double off = (x - shape) / shape;
    const double s2 = shape * shape;
    const double remainder = (1 / 12.0 - (1 / 360.0 - (1 / 1260.0 - 1 / (1680 * s2)) / s2) / s2) / shape;
    return d_m * std::exp(shape * (std::log1p(off) - off) - remainder) *
           std::sqrt(shape / 6.283185307179586) / x;
}

rician::rician(double k_db) : d_k_db(k_db), d_k(std::pow(10.0, k_db / 10))
{
    if (!(std::abs(k_db) <= greatest_k_db))
        throw std::invalid_argument(
            shown("K of the Rician law must lie between -100 and 100 dB, got ", k_db));
}

std::string rician::name() const
{
    return shown("rician:", d_k_db);
}

double rician::tail(double u) const
{
    return std::exp(ln_tail(u));
}

double rician::ln_tail(double u) const
{
    return -std::log1p(u / (1 + d_k)) - d_k * u / (1 + d_k + u);
}

double rician::density(double g, unsigned branches) const
{
    // Non-central chi-square of 2L degrees of freedom (Simon and Alouini 2005, section 2.2.1.2 and 9.2).
    const double l = branches;
    const double scattered = (1 + d_k) * g, steady = l * d_k;
    const double apart = std::sqrt(scattered) - std::sqrt(steady);
    const double z = 2 * std::sqrt(scattered * steady);
    const double ln_rise = 0.5 * (l - 1) * std::log(scattered / steady);
    if (z < 1e-8) // I_v(z) = (z/2)^v/Γ(v+1) to working precision
        return (1 + d_k) * std::exp((l - 1) * std::log(scattered) - scattered - steady - std::lgamma(l));
    return (1 + d_k) * std::exp(ln_rise - apart * apart + ln_scaled_bessel(l - 1, z));
}

} // namespace halfplane
