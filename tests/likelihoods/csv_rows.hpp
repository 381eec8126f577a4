// SPDX-License-Identifier: Apache-2.0
#pragma once
// Rows of a small reference CSV with quoted cells, by column name. Lines that begin with # are its sources.

#include <fstream>
#include <map>
#include <stdexcept>
#include <string>
#include <vector>

namespace steelyard::test {

using CsvRow = std::map<std::string, std::string>;

inline std::vector<std::string> split_csv_line(const std::string& line) {
    std::vector<std::string> cells(1);
    bool quoted = false;
    for (const char c : line) {
        if (c == '"') {
            quoted = !quoted;
        } else if (c == ',' && !quoted) {
            cells.emplace_back();
        } else if (c != '\r') {
            cells.back() += c;
        }
    }
    return cells;
}

inline std::vector<CsvRow> read_csv_rows(const std::string& name) {
    std::ifstream in(std::string(STEELYARD_TEST_DIR) + "/reference/" + name);
    if (!in) {
        throw std::runtime_error("no reference table " + name);
    }
    std::vector<std::string> header;
    std::vector<CsvRow> rows;
    for (std::string line; std::getline(in, line);) {
        if (line.empty() || line.front() == '#') {
            continue;
        }
        const std::vector<std::string> cells = split_csv_line(line);
        if (header.empty()) {
            header = cells;
            continue;
        }
        if (cells.size() != header.size()) {
            throw std::runtime_error(name + ": wrong number of cells: " + line);
        }
        CsvRow row;
        for (std::size_t i = 0; i < cells.size(); ++i) {
            row[header[i]] = cells[i];
        }
        rows.push_back(row);
    }
    return rows;
}

}  // namespace steelyard::test
