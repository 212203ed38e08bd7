// SPDX-License-Identifier: GPL-3.0-or-later
// link_model: one simulated link at one Es/N0, and the counting of any stretch of its symbols.
#pragma once

#include "gain_sampler.h"
#include "halfplane/kernels/detect.h"
#include "halfplane/simulate.h"

#include <complex>
#include <cstdint>
#include <memory>
#include <vector>

namespace halfplane {

/// Immutable after construction; count() may run on several threads at once.
class link_model
{
public:
    /// \throws std::invalid_argument naming the option that is refused
    link_model(const signal_set& set, const simulation_options& options);

    /// Adds symbols first … first + count − 1 to `to`; first must be a multiple of `block`.
    void count(std::uint64_t first, std::uint64_t count, tally& to) const;

    static constexpr std::size_t block =
        2048; ///< symbols that pass through the stages together, within the cache

    const signal_set& set() const noexcept { return d_set; }
    const std::vector<complex>& means() const noexcept { return d_means; }
    const kernels::point_decider& decider() const noexcept { return d_decider; }
    bool map_rule() const noexcept { return d_map_rule; }
    double n0() const noexcept { return d_n0; }
    bool fading() const noexcept { return d_gain != nullptr; }

private:
    void draw_symbols(std::uint64_t first, std::size_t count, std::uint16_t* index) const;
    void
    receive_faded(std::uint64_t first, std::size_t count, std::complex<float>* samples, double* gain) const;
    std::uint16_t decide_faded(std::complex<float> sample, double gain) const;

    signal_set d_set;
    std::vector<complex> d_means;
    std::vector<std::complex<float>> d_sent; ///< the means in float
    std::uint64_t d_seed;
    double d_n0;
    bool d_map_rule;
    std::unique_ptr<gain_sampler> d_gain;
    kernels::point_decider d_decider;
    std::vector<std::uint64_t> d_limit; ///< cumulated priors in units of 2^-32; empty where equal
    std::vector<std::uint16_t>
        d_start; ///< by the top twelve bits of a word, the first index that it can mean
};

} // namespace halfplane
