// SPDX-License-Identifier: GPL-3.0-or-later
// carry: sums of a run as a document, and back to the bit, so that a later run can go on with them.
#pragma once

#include <nlohmann/json.hpp>

#include <array>
#include <complex>
#include <cstdint>
#include <map>
#include <stdexcept>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

namespace halfplane {

/*!
 * A class that can be carried lists its members once, for both directions:
 *
 *     template <typename Archive>
 *     void carry(Archive& a) { a("blocks", d_blocks); a("errors", d_errors); }
 *
 * Numbers, arrays, vectors, maps and classes of that kind may be members. Doubles come back exactly by their
 * shortest text, a long double as the sum of two doubles.
 */
class carry_writer
{
public:
    template <typename T>
    void operator()(const char* name, const T& value)
    {
        d_out[name] = document(value);
    }

    template <typename T>
    static nlohmann::json document(const T& value)
    {
        if constexpr (std::is_same_v<T, long double>) {
            const auto high = static_cast<double>(value);
            return {high, static_cast<double>(value - high)};
        } else if constexpr (std::is_arithmetic_v<T>) {
            return value;
        } else {
            carry_writer inner;
            const_cast<T&>(value).carry(inner); // which only reads when it is given a writer
            return std::move(inner.d_out);
        }
    }
    static nlohmann::json document(const nlohmann::json& as_it_is) { return as_it_is; }
    static nlohmann::json document(const std::complex<double>& z) { return {z.real(), z.imag()}; }
    template <typename T, std::size_t N>
    static nlohmann::json document(const std::array<T, N>& values)
    {
        return list(values);
    }
    template <typename T>
    static nlohmann::json document(const std::vector<T>& values)
    {
        return list(values);
    }
    template <typename K, typename T>
    static nlohmann::json document(const std::map<K, T>& values)
    {
        auto out = nlohmann::json::array();
        for (const auto& [key, value] : values)
            out.push_back({key, document(value)});
        return out;
    }

private:
    template <typename List>
    static nlohmann::json list(const List& values)
    {
        auto out = nlohmann::json::array();
        for (const auto& value : values)
            out.push_back(document(value));
        return out;
    }
    nlohmann::json d_out = nlohmann::json::object();
};

/// Vectors and arrays must come with the length that they have. \throws std::invalid_argument naming the
/// field
class carry_reader
{
public:
    explicit carry_reader(const nlohmann::json& in) : d_in(in) {}

    template <typename T>
    void operator()(const char* name, T& value)
    {
        try {
            read(d_in.at(name), value);
        } catch (const std::exception& error) { // names the path from the outside in
            throw std::invalid_argument(std::string(name) + ": " + error.what());
        }
    }

    template <typename T>
    static void read(const nlohmann::json& from, T& value)
    {
        if constexpr (std::is_same_v<T, long double>) {
            value = static_cast<long double>(from.at(0).get<double>()) + from.at(1).get<double>();
        } else if constexpr (std::is_arithmetic_v<T>) {
            from.get_to(value);
        } else {
            carry_reader inner(from);
            value.carry(inner);
        }
    }
    static void read(const nlohmann::json& from, nlohmann::json& value) { value = from; }
    static void read(const nlohmann::json& from, std::complex<double>& z)
    {
        z = {from.at(0).get<double>(), from.at(1).get<double>()};
    }
    template <typename T, std::size_t N>
    static void read(const nlohmann::json& from, std::array<T, N>& values)
    {
        list(from, values);
    }
    template <typename T>
    static void read(const nlohmann::json& from, std::vector<T>& values)
    {
        list(from, values);
    }
    template <typename K, typename T>
    static void read(const nlohmann::json& from, std::map<K, T>& values)
    {
        values.clear();
        for (const auto& pair : from)
            read(pair.at(1), values[pair.at(0).get<K>()]);
    }

private:
    template <typename List>
    static void list(const nlohmann::json& from, List& values)
    {
        if (!from.is_array() || from.size() != values.size())
            throw std::invalid_argument(std::to_string(from.size()) + " values, expected " +
                                        std::to_string(values.size()));
        for (std::size_t k = 0; k < values.size(); ++k)
            read(from[k], values[k]);
    }
    const nlohmann::json& d_in;
};

} // namespace halfplane
