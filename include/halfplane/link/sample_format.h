// SPDX-License-Identifier: GPL-3.0-or-later
// sample_format: how complex samples stand in a file.
#pragma once

#include <complex>
#include <cstddef>
#include <string>
#include <vector>

namespace halfplane::link {

/*!
 * A SigMF datatype of complex samples: `cf32_le`, `cf32_be`, `ci16_le`, `ci16_be`, `ci8`, `cu8`, in-phase
 * before quadrature. Integers come out with full scale 1: ci16 / 2^15, ci8 / 2^7, (cu8 − 128) / 2^7 (offset
 * binary: 128 is zero). Floating-point values come out as they are, NaN and infinities too.
 */
class sample_format
{
public:
    /// \throws std::invalid_argument naming the text, and what is read instead
    explicit sample_format(const std::string& datatype);

    const std::string& name() const noexcept { return d_name; }
    std::size_t bytes() const noexcept { return d_bytes; } ///< of one complex sample

    /// `count` samples from bytes of any alignment.
    void convert(const unsigned char* in, std::size_t count, std::complex<float>* out) const noexcept;

    /// Every name that is read.
    static const std::vector<std::string>& names();

private:
    using converter = void (*)(const unsigned char*, std::size_t, std::complex<float>*) noexcept;
    std::string d_name;
    std::size_t d_bytes;
    converter d_convert;
};

} // namespace halfplane::link
