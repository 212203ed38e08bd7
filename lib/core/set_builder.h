// SPDX-License-Identifier: GPL-3.0-or-later
// set_builder: rows of a set file become a signal_set; every refusal says in which file and where.
#pragma once

#include "halfplane/signal_set.h"

#include <map>
#include <optional>
#include <string>
#include <utility>
#include <vector>

namespace halfplane::detail {

class set_builder
{
public:
    /// \param source the file's name, the start of every message
    explicit set_builder(std::string source) : d_source(std::move(source)) {}

    /*!
     * One point. `where` is its place as a message shows it ("point 3", "line 5"); i and q finite.
     * \throws invalid_set at a label, number or prior that cannot stand
     */
    void add(std::string where, const std::string& label, double i, double q, std::optional<double> prior);
    signal_set finish(std::string name, std::string note) const;

private:
    std::string d_source;
    std::vector<std::string> d_where;
    std::vector<complex> d_points;
    std::vector<label_t> d_labels;
    std::vector<double> d_priors;
    std::size_t d_label_length = 0;
    std::map<std::pair<double, double>, std::size_t> d_index_of_point;
    std::map<label_t, std::size_t> d_index_of_label;
};

/// `text` cut where it is long, control characters as '?': fit for one line of a message.
std::string one_line(const std::string& text);
/// The same in quotes.
inline std::string quoted(const std::string& text)
{
    return '"' + one_line(text) + '"';
}

/// File name without folder and extension: what a set is called that does not name itself.
std::string stem(const std::string& source);

} // namespace halfplane::detail
