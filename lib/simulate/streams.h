// SPDX-License-Identifier: GPL-3.0-or-later
// streams: which stream of random numbers serves what, so that no two uses share one.
#pragma once

#include <cstdint>

namespace halfplane::streams {

constexpr std::uint64_t noise = 0;
constexpr std::uint64_t symbols = 1;
constexpr std::uint64_t gain = 2;
constexpr std::uint64_t mixture = 3;
constexpr std::uint64_t branch = 1000; ///< and upwards

} // namespace halfplane::streams
