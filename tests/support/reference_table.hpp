// SPDX-License-Identifier: Apache-2.0
#pragma once
// Reads tests/reference/*.csv: `case,quantity,value,tol,reference`, no quoting, one expected number a line.
// The tolerance is a relative bound (`1e-12`), `abs:x`, or `exact`; the last column says where the number
// comes from.

#include <gtest/gtest.h>

#include <fstream>
#include <map>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

#include "near.hpp"

namespace steelyard::test {

class ReferenceTable {
  public:
    struct Row {
        std::string value, tolerance, origin;
        mutable bool used = false;
    };

    /// @param name  file name inside tests/reference
    explicit ReferenceTable(const std::string& name) : name_(name) {
        std::ifstream in(std::string(STEELYARD_TEST_DIR) + "/reference/" + name);
        if (!in) {
            throw std::runtime_error("no reference table " + name);
        }
        std::string line;
        std::getline(in, line);
        while (std::getline(in, line)) {
            if (line.empty() || line.front() == '#') {
                continue;
            }
            std::vector<std::string> cells;
            std::stringstream split(line);
            for (std::string cell; cells.size() < 4 && std::getline(split, cell, ',');) {
                cells.push_back(cell);
            }
            std::string rest;
            std::getline(split, rest);
            if (cells.size() != 4) {
                throw std::runtime_error(name + ": a line has no five cells: " + line);
            }
            rows_[{cells[0], cells[1]}] = Row{cells[2], cells[3], rest};
        }
    }

    bool has(const std::string& which, const std::string& quantity) const {
        return rows_.contains({which, quantity});
    }

    /// The expected number of a row.
    double value(const std::string& which, const std::string& quantity) const {
        return std::stod(row(which, quantity).value);
    }

    /// Compares by the row's own tolerance and marks the row as used.
    ::testing::AssertionResult matches(const std::string& which, const std::string& quantity,
                                       double got) const {
        const Row& expected = row(which, quantity);
        expected.used = true;
        const double want = std::stod(expected.value);
        ::testing::AssertionResult result = ::testing::AssertionSuccess();
        if (expected.tolerance == "exact") {
            result = near_rel(want, got, 0.0);
        } else if (expected.tolerance.starts_with("abs:")) {
            result = near_abs(want, got, std::stod(expected.tolerance.substr(4)));
        } else {
            const double tolerance = std::stod(expected.tolerance);
            result = near_abs(want, got, tolerance * std::abs(want) + 1e-15);
        }
        if (!result) {
            return result << " in " << name_ << " " << which << " " << quantity << " (" << expected.origin
                          << ")";
        }
        return result;
    }

    /// Rows never compared: a test of a whole table ends by demanding that this is empty.
    std::vector<std::string> unused() const {
        std::vector<std::string> names;
        for (const auto& [key, row] : rows_) {
            if (!row.used) {
                names.push_back(key.first + " " + key.second);
            }
        }
        return names;
    }

    const std::map<std::pair<std::string, std::string>, Row>& rows() const { return rows_; }

  private:
    const Row& row(const std::string& which, const std::string& quantity) const {
        const auto found = rows_.find({which, quantity});
        if (found == rows_.end()) {
            throw std::runtime_error(name_ + " has no row " + which + " " + quantity);
        }
        return found->second;
    }

    std::string name_;
    std::map<std::pair<std::string, std::string>, Row> rows_;
};

}  // namespace steelyard::test
