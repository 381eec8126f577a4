// SPDX-License-Identifier: Apache-2.0
#pragma once
// Reads the inputs that stand beside the reference tables: JSON whose numbers may be written as text ("8/13",
// "0.13"), and tables of whole numbers as CSV.

#include <Eigen/Core>
#include <fstream>
#include <nlohmann/json.hpp>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

namespace steelyard::test {

inline std::ifstream open_reference(const std::string& name) {
    std::ifstream in(std::string(STEELYARD_TEST_DIR) + "/reference/" + name);
    if (!in) {
        throw std::runtime_error("no reference file " + name);
    }
    return in;
}

inline nlohmann::json reference_json(const std::string& name) {
    std::ifstream in = open_reference(name);
    return nlohmann::json::parse(in);
}

/// 0.13, "0.13" or "8/13".
inline double number(const nlohmann::json& value) {
    if (value.is_number()) {
        return value.get<double>();
    }
    const std::string text = value.get<std::string>();
    const std::size_t slash = text.find('/');
    return slash == std::string::npos ? std::stod(text)
                                      : std::stod(text.substr(0, slash)) / std::stod(text.substr(slash + 1));
}

inline Eigen::ArrayXd numbers(const nlohmann::json& list) {
    Eigen::ArrayXd values(static_cast<Eigen::Index>(list.size()));
    for (std::size_t i = 0; i < list.size(); ++i) {
        values(static_cast<Eigen::Index>(i)) = number(list[i]);
    }
    return values;
}

/// A list of rows.
inline Eigen::ArrayXXd matrix(const nlohmann::json& rows) {
    Eigen::ArrayXXd values(static_cast<Eigen::Index>(rows.size()),
                           static_cast<Eigen::Index>(rows.at(0).size()));
    for (std::size_t i = 0; i < rows.size(); ++i) {
        values.row(static_cast<Eigen::Index>(i)) = numbers(rows[i]).transpose();
    }
    return values;
}

/// A CSV of whole numbers under one line of names.
inline Eigen::ArrayXXi whole_numbers(const std::string& name) {
    std::ifstream in = open_reference(name);
    std::string line;
    std::getline(in, line);
    std::vector<std::vector<int>> rows;
    while (std::getline(in, line)) {
        std::stringstream cells(line);
        rows.emplace_back();
        for (std::string cell; std::getline(cells, cell, ',');) {
            rows.back().push_back(std::stoi(cell));
        }
    }
    Eigen::ArrayXXi values(static_cast<Eigen::Index>(rows.size()),
                           static_cast<Eigen::Index>(rows.at(0).size()));
    for (std::size_t i = 0; i < rows.size(); ++i) {
        for (std::size_t j = 0; j < rows[i].size(); ++j) {
            values(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j)) = rows[i].at(j);
        }
    }
    return values;
}

}  // namespace steelyard::test
