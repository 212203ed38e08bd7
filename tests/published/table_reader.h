// SPDX-License-Identifier: GPL-3.0-or-later
// table_reader: rows of a comma-separated table that stands beside the tests.
#pragma once

#include <fstream>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

/// Rows of HALFPLANE_TEST_DIR/name as strings, the header line left out.
inline std::vector<std::vector<std::string>> read_table(const std::string& name)
{
    std::ifstream in(std::string(HALFPLANE_TEST_DIR) + "/" + name);
    if (!in)
        throw std::runtime_error("no table " + name);
    std::vector<std::vector<std::string>> rows;
    std::string line;
    std::getline(in, line);
    while (std::getline(in, line)) {
        std::vector<std::string> row;
        std::stringstream cells(line);
        for (std::string cell; std::getline(cells, cell, ',');)
            row.push_back(cell);
        rows.push_back(std::move(row));
    }
    return rows;
}
