// SPDX-License-Identifier: GPL-3.0-or-later
// span_pmt: spans of known symbols as they come in tags and messages.
#include "span_pmt.h"

#include <sstream>
#include <stdexcept>

namespace gr::halfplane {
namespace {

using ::halfplane::link::known_span;

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    std::ostringstream text;
    (text << ... << parts);
    throw std::invalid_argument(text.str());
}

/// As PMT writes it, shortened: a vector may be long.
std::string shown(const pmt::pmt_t& value)
{
    constexpr std::size_t longest = 60;
    const std::string text = pmt::write_string(value);
    return text.size() <= longest ? text : text.substr(0, longest) + " …";
}

template <typename T>
void take(known_span& span, const T* elements, std::size_t count, std::size_t points)
{
    span.indices.resize(count);
    for (std::size_t k = 0; k < count; ++k) {
        if (static_cast<std::uint64_t>(elements[k]) >= points) // a negative one becomes larger still
            refuse("index ",
                   k,
                   " of the span at symbol ",
                   span.first_symbol,
                   " is ",
                   +elements[k],
                   ": the set has ",
                   points,
                   " points");
        span.indices[k] = static_cast<std::uint16_t>(elements[k]);
    }
}

void take_indices(known_span& span, const pmt::pmt_t& vector, std::size_t points)
{
    std::size_t n = 0;
    if (pmt::is_u8vector(vector))
        take(span, pmt::u8vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_s8vector(vector))
        take(span, pmt::s8vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_u16vector(vector))
        take(span, pmt::u16vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_s16vector(vector))
        take(span, pmt::s16vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_u32vector(vector))
        take(span, pmt::u32vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_s32vector(vector))
        take(span, pmt::s32vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_u64vector(vector))
        take(span, pmt::u64vector_elements(vector, n), pmt::length(vector), points);
    else if (pmt::is_s64vector(vector))
        take(span, pmt::s64vector_elements(vector, n), pmt::length(vector), points);
    else
        refuse("indices are ", shown(vector), "; a vector of integers is wanted");
}

/// A dict, and not merely a pair, which PMT takes for one too.
bool has_fields(const pmt::pmt_t& value)
{
    pmt::pmt_t rest = value;
    while (pmt::is_pair(rest) && pmt::is_pair(pmt::car(rest)))
        rest = pmt::cdr(rest);
    return pmt::is_null(rest);
}

bool decoded_in(const pmt::pmt_t& fields)
{
    static const pmt::pmt_t key = pmt::mp("decoded");
    const pmt::pmt_t value = pmt::dict_ref(fields, key, pmt::PMT_F);
    if (!pmt::is_bool(value))
        refuse("decoded is ", shown(value), "; true or false is wanted");
    return pmt::to_bool(value);
}

std::uint64_t first_symbol_in(const pmt::pmt_t& fields)
{
    static const pmt::pmt_t key = pmt::mp("first_symbol");
    if (!pmt::dict_has_key(fields, key))
        refuse("first_symbol is missing");
    const pmt::pmt_t value = pmt::dict_ref(fields, key, pmt::PMT_NIL);
    if (pmt::is_uint64(value))
        return pmt::to_uint64(value);
    if (pmt::is_integer(value) && pmt::to_long(value) >= 0)
        return static_cast<std::uint64_t>(pmt::to_long(value));
    refuse("first_symbol is ", shown(value), "; an integer ≥ 0 is wanted");
}

} // namespace

known_span span_from_tag(std::uint64_t symbol, const pmt::pmt_t& value, std::size_t points)
{
    static const pmt::pmt_t indices = pmt::mp("indices");
    known_span span{symbol, {}};
    if (!has_fields(value)) {
        take_indices(span, value, points);
        return span;
    }
    if (!pmt::dict_has_key(value, indices))
        refuse("indices are missing");
    span.decoded = decoded_in(value);
    take_indices(span, pmt::dict_ref(value, indices, pmt::PMT_NIL), points);
    return span;
}

known_span span_from_pdu(const pmt::pmt_t& message, std::size_t points)
{
    if (!pmt::is_pair(message) || !has_fields(pmt::car(message)))
        refuse("it is ", shown(message), "; a pair of a dict and a vector of integers is wanted");
    const pmt::pmt_t fields = pmt::car(message);
    known_span span{first_symbol_in(fields), {}};
    span.decoded = decoded_in(fields);
    take_indices(span, pmt::cdr(message), points);
    return span;
}

} // namespace gr::halfplane
