// SPDX-License-Identifier: GPL-3.0-or-later
// set_csv: set files as a table, header label,i,q or label,i,q,p.
#include "halfplane/set_file.h"

#include "number_text.h"
#include "refusal.h"
#include "set_builder.h"

#include <cmath>
#include <istream>
#include <ostream>

namespace halfplane {

namespace {

using detail::quoted;
using detail::refuse;

std::string trimmed(const std::string& text)
{
    const auto first = text.find_first_not_of(" \t\r");
    return first == std::string::npos ? std::string()
                                      : text.substr(first, text.find_last_not_of(" \t\r") - first + 1);
}

std::vector<std::string> cells_of(const std::string& line)
{
    std::vector<std::string> cells;
    std::size_t start = 0;
    for (;;) {
        const auto comma = line.find(',', start);
        cells.push_back(trimmed(line.substr(start, comma - start)));
        if (comma == std::string::npos)
            return cells;
        start = comma + 1;
    }
}

double number_cell(const std::string& text, const char* field, const std::string& place)
{
    const double value = detail::parse_number(text);
    if (!std::isfinite(value))
        refuse<invalid_set>(place, "field \"", field, "\": must be a finite number, got ", quoted(text));
    return value;
}

} // namespace

signal_set read_set_csv(std::istream& in, const std::string& source)
{
    detail::set_builder builder(source);
    std::size_t columns = 0;
    std::string line;
    for (std::size_t number = 1; std::getline(in, line); ++number) {
        if (number == 1 && line.rfind("\xef\xbb\xbf", 0) == 0) // byte-order mark of spreadsheet programs
            line.erase(0, 3);
        if (trimmed(line).empty())
            continue;
        const std::string where = "line " + std::to_string(number), place = source + ": " + where + ": ";
        const auto cells = cells_of(line);
        if (columns == 0) {
            const bool plain = cells == std::vector<std::string>{"label", "i", "q"};
            if (!plain && cells != std::vector<std::string>{"label", "i", "q", "p"})
                refuse<invalid_set>(
                    place, "the header must be label,i,q or label,i,q,p, got ", quoted(trimmed(line)));
            columns = cells.size();
            continue;
        }
        if (cells.size() != columns)
            refuse<invalid_set>(
                place, "must have ", columns, " fields, got ", cells.size(), ": ", quoted(trimmed(line)));
        const double i = number_cell(cells[1], "i", place), q = number_cell(cells[2], "q", place);
        std::optional<double> prior;
        if (columns == 4)
            prior = number_cell(cells[3], "p", place);
        builder.add(where, cells[0], i, q, prior);
    }
    if (columns == 0)
        refuse<invalid_set>(source, ": empty; a table with the header label,i,q is expected");
    return builder.finish({}, {});
}

void write_set_csv(std::ostream& out, const signal_set& set)
{
    out << (set.uniform() ? "label,i,q\n" : "label,i,q,p\n");
    for (std::size_t k = 0; k < set.size(); ++k) {
        out << set.label_string(k) << ',' << detail::shortest(set.points()[k].real()) << ','
            << detail::shortest(set.points()[k].imag());
        if (!set.uniform())
            out << ',' << detail::shortest(set.priors()[k]);
        out << '\n';
    }
}

} // namespace halfplane
