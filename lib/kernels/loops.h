// SPDX-License-Identifier: GPL-3.0-or-later
// loops: the hot loops as a table of functions, one table for each instruction set they were compiled for.
#pragma once

#include "detect_view.h"
#include "llr_view.h"

#include <cstddef>
#include <cstdint>
#include <vector>

namespace halfplane::kernels {

struct label_error_sums {
    std::uint64_t wrong_labels, wrong_bits, wrong_bits_squared, by_bit[16];
};

/*!
 * The loops are ordinary C++ that the compiler vectorises. The same sources are compiled once for each target
 * (see CMakeLists.txt), always without contraction to fused multiply-add, so that every target gives the same
 * bits.
 */
struct loop_table {
    const char* target;
    /// Interleaved re, im in; indices out, 0xffff where a sample is not finite.
    void (*decide)(const detect_view& view, const float* in, std::uint16_t* out, std::size_t count);
    /// Samples first … first + count − 1 of a noise stream, times `scale` (= √n0), interleaved; added to
    /// `out` where `add`.
    void (*noise)(std::uint64_t seed,
                  std::uint64_t stream,
                  std::uint64_t first,
                  std::size_t count,
                  float scale,
                  bool add,
                  float* out);
    /// Words first … first + count − 1 of a stream of random words.
    void (*words)(
        std::uint64_t seed, std::uint64_t stream, std::uint64_t first, std::size_t count, std::uint32_t* out);
    std::size_t (*find_errors)(const std::uint16_t* sent,
                               const std::uint16_t* decided,
                               std::size_t count,
                               std::uint32_t* where);
    void (*count_label_errors_16)(const std::uint16_t* sent,
                                  const std::uint16_t* decided,
                                  std::size_t count,
                                  label_error_sums& to);
    void (*count_label_errors_8)(const std::uint8_t* sent,
                                 const std::uint8_t* decided,
                                 std::size_t count,
                                 label_error_sums& to);
    /// `decided` the nearest points, 0xffff for samples that are not finite; `scratch` of view.scratch()
    /// floats.
    void (*llr)(const llr_view& view,
                const float* in,
                const std::uint16_t* decided,
                float* out,
                std::size_t count,
                float* scratch);
};

/// Tables that this processor can run, the plainest first.
const std::vector<const loop_table*>& usable_loops();

/// The table in use: the last usable one unless use_target() said otherwise.
const loop_table& loops() noexcept;

} // namespace halfplane::kernels
