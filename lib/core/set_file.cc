// SPDX-License-Identifier: GPL-3.0-or-later
// set_file: from what a user writes to a signal_set.
#include "halfplane/set_file.h"

#include "refusal.h"
#include "set_builder.h"

#include <filesystem>
#include <fstream>
#include <sstream>

namespace halfplane {

namespace {

using detail::refuse;

/// The whole file. A set of 4096 points takes about 400 kB; more than `largest` is something else.
std::string contents_of(const std::string& path)
{
    constexpr std::size_t largest = std::size_t{8} << 20;
    std::ifstream file(path, std::ios::binary);
    std::string text;
    char block[65536];
    while (file.read(block, sizeof block) || file.gcount() > 0) {
        text.append(block, static_cast<std::size_t>(file.gcount()));
        if (text.size() > largest)
            refuse<invalid_set>(path, ": larger than 8 MiB, no set file");
    }
    if (!file.eof())
        refuse<invalid_set>(path, ": cannot be read");
    return text;
}

bool ends_with(const std::string& text, const std::string& end)
{
    return text.size() >= end.size() && text.compare(text.size() - end.size(), end.size(), end) == 0;
}

/// By extension, else by the first character that is not white.
bool is_json(const std::string& path, const std::string& text)
{
    if (ends_with(path, ".json"))
        return true;
    if (ends_with(path, ".csv"))
        return false;
    const auto first = text.find_first_not_of(" \t\r\n");
    return first != std::string::npos && (text[first] == '{' || text[first] == '[');
}

} // namespace

signal_set load_set(const std::string& what)
{
    const auto keyword_end = what.find(':') + 1; // 0 without a colon
    for (const auto& entry : named_sets())       // a name means the same whatever files lie about
        if (keyword_end > 0 && entry.name.compare(0, keyword_end, what, 0, keyword_end) == 0)
            return named_set(what);

    std::error_code unused;
    if (!std::filesystem::exists(what, unused)) {
        if (keyword_end > 0)
            return named_set(what); // throws, with the closest name
        refuse<invalid_set>(
            "no set file ", detail::quoted(what), "; a named set is written like psk:8 or std:38.211/16qam");
    }
    if (std::filesystem::is_directory(what, unused))
        refuse<invalid_set>(what, ": is a folder, no set file");
    const std::string text = contents_of(what);
    std::istringstream in(text);
    return is_json(what, text) ? read_set_json(in, what) : read_set_csv(in, what);
}

} // namespace halfplane
