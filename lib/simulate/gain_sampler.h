// SPDX-License-Identifier: GPL-3.0-or-later
// gain_sampler: draws the power gain of a channel law, by counter.
#pragma once

#include "halfplane/law.h"

#include <cstddef>
#include <cstdint>
#include <memory>

namespace halfplane {

/// Draws of the power gain G of a law: draw k of a seed is a pure function of both.
class gain_sampler
{
public:
    virtual ~gain_sampler() = default;
    /// Gains of symbols first … first + count − 1, first a multiple of 2.
    virtual void draw(std::uint64_t seed, std::uint64_t first, std::size_t count, double* gain) const = 0;

    /*!
     * The sampler of a law: by its states where the gain takes finitely many values, by its name (`rayleigh`,
     * `rician:K_DB`, `nakagami:M`, each with `*L`) otherwise. Nothing for AWGN, whose gain is 1.
     * \throws std::invalid_argument for a law of neither kind, naming it
     */
    static std::unique_ptr<gain_sampler> of(const law& channel);
};

} // namespace halfplane
