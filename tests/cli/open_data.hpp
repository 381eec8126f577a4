// SPDX-License-Identifier: Apache-2.0
#pragma once
// The open data sets of tests/data/open and what is expected of them.

#include <gtest/gtest.h>

#include <fstream>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

namespace steelyard::test {

/// The cells of a file without quotes, a row a line; lines that begin with # are comments.
inline std::vector<std::vector<std::string>> plain_cells(std::istream& in) {
    std::vector<std::vector<std::string>> rows;
    for (std::string line; std::getline(in, line);) {
        if (line.starts_with("#")) {
            continue;
        }
        std::vector<std::string> cells;
        std::size_t from = 0;
        for (std::size_t to = 0; to != std::string::npos; from = to + 1) {
            to = line.find(',', from);
            cells.push_back(line.substr(from, to - from));
        }
        rows.push_back(std::move(cells));
    }
    return rows;
}
inline std::vector<std::vector<std::string>> plain_cells_of(const std::string& path) {
    std::ifstream in(path);
    if (!in) {
        throw std::runtime_error("cannot read " + path);
    }
    return plain_cells(in);
}
inline std::vector<std::vector<std::string>> plain_cells_in(const std::string& text) {
    std::istringstream in(text);
    return plain_cells(in);
}

/// One data set under one prior set.
struct OpenData {
    std::string id;          ///< in tests/reference/open_data.csv
    std::string cases;       ///< in tests/data/open
    std::string tables;      ///< in tests/data/tables
    std::string priors;      ///< in tests/data/tables
    std::string posteriors;  ///< in tests/reference
    std::vector<std::string> causes;

    std::string cases_file() const { return STEELYARD_TEST_DIR "/data/open/" + cases; }
    std::vector<std::string> sets() const {
        return {"--tables", STEELYARD_TEST_DIR "/data/tables/" + tables, "--priors",
                STEELYARD_TEST_DIR "/data/tables/" + priors};
    }
    /// Truth and posteriors, a row a case in their order, under a header.
    std::vector<std::vector<std::string>> expected() const {
        return plain_cells_of(STEELYARD_TEST_DIR "/reference/" + posteriors);
    }
};

inline const OpenData urine = {"URINE_RESUB",
                               "urine_crystals_cases.csv",
                               "urine_crystals",
                               "urine_crystals-priors.yaml",
                               "audit_urine_same_rows.csv",
                               {"no_crystals", "crystals"}};
inline const OpenData urine_nine_to_one = {"URINE_PRIOR10",
                                           "urine_crystals_cases.csv",
                                           "urine_crystals",
                                           "urine_crystals-priors-9-to-1.yaml",
                                           "audit_urine_nine_to_one.csv",
                                           {"no_crystals", "crystals"}};
inline const OpenData wine = {"WINE_SPLIT",       "wine_cases.csv",       "wine",
                              "wine-priors.yaml", "audit_wine_split.csv", {"first", "second", "third"}};

}  // namespace steelyard::test
