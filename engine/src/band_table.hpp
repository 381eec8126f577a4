// SPDX-License-Identifier: Apache-2.0
#pragma once
// What every function of information and fit asks of its inputs: probabilities of causes, and tables of
// P(band | cause), shape (B, K), whose columns sum to 1.

#include <Eigen/Core>
#include <cmath>
#include <optional>
#include <string>
#include <string_view>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {

inline constexpr double probability_tolerance = 1e-9;  ///< by which given probabilities may miss the sum 1

/// Each column sums to 1. @throws DomainError
inline void check_columns_sum_to_one(std::string_view function, std::string_view argument,
                                     const Eigen::Ref<const Eigen::ArrayXXd>& table) {
    check_all_between(function, argument, table, 0.0, 1.0);
    for (Eigen::Index column = 0; column < table.cols(); ++column) {
        const double sum = table.col(column).sum();
        if (!(std::abs(sum - 1.0) <= probability_tolerance)) {
            throw DomainError(function, std::string(argument) + " column sum", std::nullopt, column, sum,
                              "1 within 1e-9");
        }
    }
}

/// A table of bands by causes with at least one band. @throws DomainError
inline void check_band_table(std::string_view function, std::string_view argument,
                             const Eigen::Ref<const Eigen::ArrayXXd>& table, Eigen::Index causes) {
    check_size_at_least(function, argument, table.rows(), 1);
    if (table.cols() != causes) {
        check_size(function, std::string(argument) + " columns", table.cols(), causes);
    }
    check_columns_sum_to_one(function, argument, table);
}

/// Probabilities of one or more causes. @throws DomainError
inline void check_causes(std::string_view function, std::string_view argument,
                         const Eigen::Ref<const Eigen::ArrayXd>& probability) {
    check_size_at_least(function, argument, probability.size(), 1);
    check_simplex(function, argument, probability, probability_tolerance);
}

}  // namespace steelyard::engine
