// SPDX-License-Identifier: GPL-3.0-or-later
// pattern: O.150 sequences, draws by prior and files, all as indices of a set.
#include "halfplane/pattern.h"

#include "pattern_file.h"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <stdexcept>

namespace halfplane {

namespace {

/// Symbols of one period that are kept as a table: all but the long shift registers.
constexpr std::uint64_t longest_table = std::uint64_t{1} << 20;

[[noreturn]] void refuse(const std::string& text, const std::string& why)
{
    throw std::invalid_argument("pattern '" + text + "': " + why);
}

/// Decimal digits only; `what` names the part in the message.
std::uint64_t number(const std::string& text,
                     const std::string& digits,
                     const char* what,
                     std::uint64_t low,
                     std::uint64_t high)
{
    const auto complain = [&] {
        refuse(text,
               std::string(what) + " must be a whole number from " + std::to_string(low) + " to " +
                   std::to_string(high) + ", got '" + digits + "'");
    };
    if (digits.empty())
        complain();
    std::uint64_t value = 0;
    for (char c : digits) {
        if (c < '0' || c > '9')
            complain();
        const auto digit = static_cast<std::uint64_t>(c - '0');
        if (value > (high - std::min(high, digit)) / 10)
            complain();
        value = 10 * value + digit;
    }
    if (value < low)
        complain();
    return value;
}

/// Output k of SplitMix64 (Steele, Lea, Flood, OOPSLA 2014) started at `seed`.
std::uint64_t splitmix64(std::uint64_t seed, std::uint64_t k)
{
    std::uint64_t z = seed + (k + 1) * 0x9e3779b97f4a7c15ull;
    z = (z ^ z >> 30) * 0xbf58476d1ce4e5b9ull;
    z = (z ^ z >> 27) * 0x94d049bb133111ebull;
    return z ^ z >> 31;
}

/// C_i of the header: integers, so that every platform draws the same.
std::vector<std::uint64_t> draw_thresholds(const signal_set& set)
{
    constexpr std::uint64_t whole = std::uint64_t{1} << 32;
    const std::size_t m = set.size();
    std::vector<std::uint64_t> thresholds(m);
    double sum = 0;
    for (std::size_t i = 0; i < m; ++i) {
        sum += set.priors()[i];
        thresholds[i] = set.uniform()
                            ? whole * (i + 1) / m
                            : std::min(whole, static_cast<std::uint64_t>(std::floor(std::ldexp(sum, 32))));
    }
    thresholds[m - 1] = whole;
    return thresholds;
}

} // namespace

pattern::pattern(const std::string& text, const signal_set& set)
    : d_text(text), d_label_bits(set.label_bits())
{
    const auto colon = text.find(':');
    const std::string name = text.substr(0, colon);
    const std::string rest = colon == std::string::npos ? std::string{} : text.substr(colon + 1);
    if (name == "o150")
        build_register(rest, set);
    else if (name == "draw")
        build_draw(rest, set);
    else if (name == "file")
        build_file(rest, set);
    else
        refuse(text, "known are o150:N, draw:SEED[:PERIOD] and file:PATH");
}

void pattern::build_register(const std::string& stages, const signal_set& set)
{
    d_kind = kind::shift_register;
    d_carries_bits = true;
    const auto& known = o150_sequences();
    const auto found = std::find_if(
        known.begin(), known.end(), [&](const auto& s) { return std::to_string(s.stages) == stages; });
    if (found == known.end())
        refuse(d_text,
               "ITU-T O.150 sequences here have 9, 11, 15, 20, 23, 29 or 31 stages, got '" + stages + "'");
    if (set.size() != std::size_t{1} << d_label_bits)
        refuse(d_text,
               "bits need a point for every label; this set has " + std::to_string(set.size()) +
                   " points for " + std::to_string(std::size_t{1} << d_label_bits) + " labels of " +
                   std::to_string(d_label_bits) + " bits (use draw or a file of indices)");
    d_stages = found->stages;
    d_tap = found->tap;
    d_inverted = found->inverted;
    d_index_of_label.resize(set.size());
    for (std::size_t label = 0; label < set.size(); ++label)
        d_index_of_label[label] =
            static_cast<std::uint16_t>(set.index_of_label(static_cast<unsigned>(label)));

    const std::uint64_t bits = (std::uint64_t{1} << d_stages) - 1;
    d_period = bits / std::gcd(bits, std::uint64_t{d_label_bits});
    if (d_period <= longest_table) {
        std::vector<std::uint16_t> table(d_period);
        reader(*this).next(table.size(), table.data());
        d_table = std::move(table);
    }
}

void pattern::build_draw(const std::string& seed_and_period, const signal_set& set)
{
    d_kind = kind::draw;
    const auto colon = seed_and_period.find(':');
    const std::uint64_t seed =
        number(d_text, seed_and_period.substr(0, colon), "the seed", 0, ~std::uint64_t{0});
    d_period = colon == std::string::npos
                   ? default_draw_period
                   : number(d_text, seed_and_period.substr(colon + 1), "the period", 1, max_draw_period);

    const auto thresholds = draw_thresholds(set);
    d_table.resize(d_period);
    for (std::uint64_t k = 0; k < d_period; ++k) {
        const auto above = std::upper_bound(thresholds.begin(), thresholds.end(), splitmix64(seed, k) >> 32);
        d_table[k] = static_cast<std::uint16_t>(above - thresholds.begin());
    }
}

void pattern::build_file(const std::string& path, const signal_set& set)
{
    d_kind = kind::file;
    auto read = read_pattern_file(path, set);
    d_table = std::move(read.indices);
    d_carries_bits = read.bits;
    d_period = d_table.size();
}

void pattern::indices(std::uint64_t first, std::size_t count, std::uint16_t* out) const
{
    reader r(*this);
    r.seek(first);
    r.next(count, out);
}

pattern::reader::reader(const pattern& p)
    : d_pattern(&p), d_register(p.d_stages ? p.d_stages : 2, p.d_stages ? p.d_tap : 1)
{
    seek(0);
}

void pattern::reader::seek(std::uint64_t symbol)
{
    symbol %= d_pattern->d_period;
    d_symbol = symbol;
    d_from_register = d_pattern->d_table.empty();
    if (d_from_register)
        d_register.seek(symbol * d_pattern->d_label_bits);
}

void pattern::reader::seek_bit(std::uint64_t bit)
{
    if (d_pattern->d_kind != kind::shift_register)
        throw std::invalid_argument("only shift registers are read from a bit on");
    d_from_register = true;
    d_register.seek(bit);
}

void pattern::reader::next(std::size_t count, std::uint16_t* out)
{
    if (d_from_register) {
        const unsigned width = d_pattern->d_label_bits;
        const std::uint32_t flip = d_pattern->d_inverted ? (1u << width) - 1 : 0;
        const auto* index = d_pattern->d_index_of_label.data();
        for (std::size_t k = 0; k < count; ++k)
            out[k] = index[d_register.take(width) ^ flip];
        return;
    }
    const auto& table = d_pattern->d_table;
    while (count > 0) {
        const std::size_t run = std::min<std::size_t>(count, table.size() - d_symbol);
        std::copy_n(table.begin() + static_cast<std::ptrdiff_t>(d_symbol), run, out);
        out += run;
        count -= run;
        d_symbol = (d_symbol + run) % table.size();
    }
}

} // namespace halfplane
