// SPDX-License-Identifier: Apache-2.0
#pragma once
// Forecasts and final causes for the tests of the audit: read from tests/reference, or made.

#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <cstdint>
#include <sstream>
#include <string>
#include <vector>

#include "reference_inputs.hpp"
#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/counter_random.hpp"

namespace steelyard::test {

/// A CSV of words: comment lines, one line of names, rows.
struct WordTable {
    std::vector<std::string> names;
    std::vector<std::vector<std::string>> rows;

    explicit WordTable(const std::string& name) {
        std::ifstream in = open_reference(name);
        for (std::string line; std::getline(in, line);) {
            if (line.starts_with('#')) {
                continue;
            }
            std::vector<std::string> cells;
            std::stringstream split(line);
            for (std::string cell; std::getline(split, cell, ',');) {
                cells.push_back(cell);
            }
            (names.empty() ? names : rows.emplace_back()) = cells;
        }
    }
};

/// Patient by patient: the final cause in the first column, then one forecast per cause; causes are named in
/// the order of the columns (`p_` or `p` before the name is not part of it). A forecast of 0 is read as
/// 1e-300. A row without a final cause has no patients.
inline engine::AuditSample read_forecasts(const std::string& name,
                                          std::vector<std::string>* causes = nullptr) {
    const WordTable table(name);
    std::vector<std::string> names(table.names.begin() + 1, table.names.end());
    for (std::string& cause : names) {
        cause = cause.starts_with("p_") ? cause.substr(2) : cause.starts_with("p") ? cause.substr(1) : cause;
    }
    const auto patients = static_cast<Eigen::Index>(table.rows.size());
    const auto size = static_cast<Eigen::Index>(names.size());
    engine::AuditSample sample{Eigen::ArrayXXd(patients, size), Eigen::ArrayXXd::Zero(patients, size)};
    for (Eigen::Index i = 0; i < patients; ++i) {
        const std::vector<std::string>& row = table.rows[static_cast<std::size_t>(i)];
        for (Eigen::Index k = 0; k < size; ++k) {
            const double p = std::stod(row.at(static_cast<std::size_t>(k) + 1));
            sample.log_forecast(i, k) = std::log(std::max(p, 1e-300));
        }
        const auto own = std::find(names.begin(), names.end(), row.at(0)) - names.begin();
        if (own < size) {  // otherwise the final cause is not known, and the row counts nobody
            sample.count(i, own) = 1.0;
        }
    }
    if (causes != nullptr) {
        *causes = names;
    }
    return sample;
}

/// Rows of scores brought to log probabilities.
inline Eigen::ArrayXXd normalised(Eigen::ArrayXXd score) {
    for (Eigen::Index g = 0; g < score.rows(); ++g) {
        score.row(g) -= score.row(g).maxCoeff();
        score.row(g) -= std::log(score.row(g).exp().sum());
    }
    return score;
}

/// Forecasts with log odds within about -/+ `width`, and counts from 0 to `most`, from a seed.
inline engine::AuditSample made_sample(Eigen::Index patterns, Eigen::Index causes, double width, int most,
                                       std::uint64_t seed) {
    engine::AuditSample sample{Eigen::ArrayXXd(patterns, causes), Eigen::ArrayXXd(patterns, causes)};
    std::uint64_t at = 0;
    for (Eigen::Index g = 0; g < patterns; ++g) {
        for (Eigen::Index k = 0; k < causes; ++k) {
            sample.log_forecast(g, k) = width * engine::uniform(seed, 1, at);
            sample.count(g, k) = std::floor((most + 1) * engine::uniform(seed, 2, at));
            ++at;
        }
    }
    sample.log_forecast = normalised(sample.log_forecast);
    sample.count(0, 0) += 1.0;
    return sample;
}

}  // namespace steelyard::test
