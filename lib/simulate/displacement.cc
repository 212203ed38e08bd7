// SPDX-License-Identifier: GPL-3.0-or-later
// displacement: memoryless disturbances of the points.
#include "halfplane/simulate.h"

#include <cmath>
#include <stdexcept>
#include <string>

namespace halfplane {

namespace {
void require(bool holds, const char* field, double value, const char* range)
{
    if (!holds)
        throw std::invalid_argument(std::string("displacement: ") + field + " must be " + range + ", not " +
                                    std::to_string(value));
}
} // namespace

std::vector<complex> displacement::means(const signal_set& set) const
{
    require(std::isfinite(rotation), "rotation", rotation, "finite");
    require(std::isfinite(gain_imbalance_db), "gain_imbalance_db", gain_imbalance_db, "finite");
    require(std::isfinite(phase_imbalance), "phase_imbalance", phase_imbalance, "finite");
    require(std::isfinite(offset.real()), "offset (real)", offset.real(), "finite");
    require(std::isfinite(offset.imag()), "offset (imaginary)", offset.imag(), "finite");
    require(
        std::isfinite(saturation) && saturation >= 0, "saturation", saturation, "finite and not negative");
    require(std::isfinite(compression_smoothness) && compression_smoothness > 0,
            "compression_smoothness",
            compression_smoothness,
            "finite and positive");

    const double half_gain = std::pow(10.0, gain_imbalance_db / 40);
    const double c = std::cos(phase_imbalance / 2), s = std::sin(phase_imbalance / 2);
    std::vector<complex> out;
    for (complex z : set.points()) {
        if (saturation > 0)
            z /= std::pow(1 + std::pow(std::abs(z) / saturation, 2 * compression_smoothness),
                          1 / (2 * compression_smoothness));
        // Each axis turns by half the phase error towards the other.
        const double i = z.real() * half_gain, q = z.imag() / half_gain;
        z = complex(i * c + q * s, q * c + i * s);
        out.push_back(z * std::polar(1.0, rotation) + offset);
    }
    return out;
}

} // namespace halfplane
