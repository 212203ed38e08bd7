// SPDX-License-Identifier: GPL-3.0-or-later
// pattern_file: tells bits from indices by their lines, and names file, line and value of what it refuses.
#include "pattern_file.h"

#include <algorithm>
#include <fstream>
#include <numeric>
#include <sstream>
#include <stdexcept>

namespace halfplane {

namespace {

/// Bits or indices that one file may hold; more would be a recording rather than a pattern.
constexpr std::size_t longest_file = std::size_t{1} << 24;

struct line {
    std::size_t number;
    std::vector<std::string> words;
};

[[noreturn]] void refuse(const std::string& path, std::size_t number, const std::string& why)
{
    throw std::invalid_argument(path + ", line " + std::to_string(number) + ": " + why);
}

std::vector<line> read_lines(const std::string& path)
{
    std::ifstream in(path);
    if (!in)
        throw std::invalid_argument("cannot open pattern file '" + path + "'");
    std::vector<line> lines;
    std::string text;
    for (std::size_t number = 1; std::getline(in, text); ++number) {
        std::istringstream words(text);
        line l{number, {}};
        for (std::string word; words >> word;)
            l.words.push_back(word);
        if (!l.words.empty())
            lines.push_back(std::move(l));
    }
    if (in.bad() || lines.empty())
        throw std::invalid_argument("pattern file '" + path + "' holds no bits and no indices");
    return lines;
}

bool are_bits(const std::vector<line>& lines)
{
    return std::all_of(lines.begin(), lines.end(), [](const line& l) {
        return l.words.size() == 1 && l.words[0].find_first_not_of("01") == std::string::npos;
    });
}

std::vector<std::uint16_t>
indices_of_bits(const std::string& path, const std::vector<line>& lines, const signal_set& set)
{
    const unsigned width = set.label_bits();
    if (set.size() != std::size_t{1} << width)
        throw std::invalid_argument(
            "pattern file '" + path + "' holds bits, and bits need a point for every label; " +
            "this set has " + std::to_string(set.size()) + " points for " +
            std::to_string(std::size_t{1} << width) + " labels (write indices instead)");
    std::string bits;
    for (const auto& l : lines) {
        bits += l.words[0];
        if (bits.size() > longest_file)
            refuse(path, l.number, "more than " + std::to_string(longest_file) + " bits");
    }
    // Bits run on across the end of the file, so the symbols repeat once both lengths fit.
    std::vector<std::uint16_t> indices(bits.size() / std::gcd(bits.size(), std::size_t{width}));
    std::size_t at = 0;
    for (auto& index : indices) {
        unsigned label = 0;
        for (unsigned k = 0; k < width; ++k, at = (at + 1) % bits.size())
            label = label << 1 | (bits[at] == '1');
        index = static_cast<std::uint16_t>(set.index_of_label(label));
    }
    return indices;
}

std::vector<std::uint16_t>
indices_of_words(const std::string& path, const std::vector<line>& lines, const signal_set& set)
{
    std::vector<std::uint16_t> indices;
    for (const auto& l : lines)
        for (const auto& word : l.words) {
            if (word.find_first_not_of("0123456789") != std::string::npos)
                refuse(path, l.number, "'" + word + "' is neither an index nor bits");
            if (word.size() > 1 && word[0] == '0')
                refuse(path,
                       l.number,
                       "index '" + word + "' has a leading zero (bits are written without spaces)");
            if (word.size() > 4 || std::stoul(word) >= set.size())
                refuse(path,
                       l.number,
                       "index " + word + " is not in the set of " + std::to_string(set.size()) +
                           " points, 0 to " + std::to_string(set.size() - 1));
            if (indices.size() == longest_file)
                refuse(path, l.number, "more than " + std::to_string(longest_file) + " indices");
            indices.push_back(static_cast<std::uint16_t>(std::stoul(word)));
        }
    return indices;
}

} // namespace

pattern_file read_pattern_file(const std::string& path, const signal_set& set)
{
    const auto lines = read_lines(path);
    pattern_file read;
    read.bits = are_bits(lines);
    read.indices = read.bits ? indices_of_bits(path, lines, set) : indices_of_words(path, lines, set);
    return read;
}

} // namespace halfplane
