// SPDX-License-Identifier: GPL-3.0-or-later
// sample_format: plain loops over pairs of numbers, which the compiler turns into vector code.
#include "halfplane/link/sample_format.h"

#include <boost/endian/conversion.hpp>

#include <cstdint>
#include <cstring>
#include <stdexcept>

namespace halfplane::link {

namespace {

template <typename T>
T raw(const unsigned char* at) noexcept
{
    T value;
    std::memcpy(&value, at, sizeof value);
    return value;
}

float as_float(std::uint32_t bits) noexcept
{
    float value;
    std::memcpy(&value, &bits, sizeof value);
    return value;
}

template <boost::endian::order Order>
void from_f32(const unsigned char* in, std::size_t count, std::complex<float>* out) noexcept
{
    const auto number = [&](std::size_t k) {
        return as_float(boost::endian::conditional_reverse<Order, boost::endian::order::native>(
            raw<std::uint32_t>(in + 4 * k)));
    };
    for (std::size_t k = 0; k < count; ++k)
        out[k] = {number(2 * k), number(2 * k + 1)};
}

template <boost::endian::order Order>
void from_i16(const unsigned char* in, std::size_t count, std::complex<float>* out) noexcept
{
    const auto number = [&](std::size_t k) {
        const auto bits = boost::endian::conditional_reverse<Order, boost::endian::order::native>(
            raw<std::uint16_t>(in + 2 * k));
        return static_cast<float>(static_cast<std::int16_t>(bits)) * 0x1p-15f;
    };
    for (std::size_t k = 0; k < count; ++k)
        out[k] = {number(2 * k), number(2 * k + 1)};
}

template <typename T, int Zero>
void from_8(const unsigned char* in, std::size_t count, std::complex<float>* out) noexcept
{
    const auto number = [&](std::size_t k) {
        return static_cast<float>(static_cast<T>(in[k]) - Zero) * 0x1p-7f;
    };
    for (std::size_t k = 0; k < count; ++k)
        out[k] = {number(2 * k), number(2 * k + 1)};
}

struct known {
    const char* name;
    std::size_t bytes;
    void (*convert)(const unsigned char*, std::size_t, std::complex<float>*) noexcept;
};

constexpr known known_formats[] = {
    {"cf32_le", 8, from_f32<boost::endian::order::little>},
    {"cf32_be", 8, from_f32<boost::endian::order::big>},
    {"ci16_le", 4, from_i16<boost::endian::order::little>},
    {"ci16_be", 4, from_i16<boost::endian::order::big>},
    {"ci8", 2, from_8<std::int8_t, 0>},
    {"cu8", 2, from_8<std::uint8_t, 128>},
};

} // namespace

const std::vector<std::string>& sample_format::names()
{
    static const std::vector<std::string> all = [] {
        std::vector<std::string> names;
        for (const auto& each : known_formats)
            names.emplace_back(each.name);
        return names;
    }();
    return all;
}

sample_format::sample_format(const std::string& datatype) : d_name(datatype)
{
    for (const auto& each : known_formats)
        if (datatype == each.name) {
            d_bytes = each.bytes;
            d_convert = each.convert;
            return;
        }
    std::string message = "'" + datatype + "' is no format that is read";
    if (!datatype.empty() && datatype[0] == 'r')
        message += ": real samples, where one complex sample a symbol is wanted";
    message += "; known are";
    for (const auto& each : names())
        message += (each == names().front() ? " " : ", ") + each;
    throw std::invalid_argument(message);
}

void sample_format::convert(const unsigned char* in,
                            std::size_t count,
                            std::complex<float>* out) const noexcept
{
    d_convert(in, count, out);
}

} // namespace halfplane::link
