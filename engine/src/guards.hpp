// SPDX-License-Identifier: Apache-2.0
#pragma once
// Guards of the engine's own bodies, beside those of domain_error.hpp.

#include <Eigen/Core>
#include <cmath>
#include <optional>
#include <string>
#include <string_view>

#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/index.hpp"

namespace steelyard::engine {

/// A size is large enough. @throws DomainError carrying the size found
inline void check_size_at_least(std::string_view function, std::string_view argument, Eigen::Index found,
                                Eigen::Index least) {
    if (found < least) {
        throw DomainError(function, std::string(argument) + " size", std::nullopt, std::nullopt,
                          static_cast<double>(found), "at least " + std::to_string(least));
    }
}

/// Every entry is finite, > 0 and at most `high`; names the first that is not. @throws DomainError
inline void check_all_positive(std::string_view function, std::string_view argument,
                               const Eigen::Ref<const Eigen::ArrayXXd>& values, double high,
                               std::string_view requirement) {
    for (Eigen::Index column = 0; column < values.cols(); ++column) {
        for (Eigen::Index row = 0; row < values.rows(); ++row) {
            const double value = values(row, column);
            if (!(std::isfinite(value) && value > 0.0 && value <= high)) {
                const auto named_column =
                    values.cols() == 1 ? std::nullopt : std::optional<Eigen::Index>(column);
                throw DomainError(function, argument, row, named_column, value, requirement);
            }
        }
    }
}

/// An index points into an array of `size`. @throws DomainError
inline void check_index(std::string_view function, std::string_view argument, Eigen::Index index,
                        Eigen::Index size) {
    if (index < 0 || index >= size) {
        throw DomainError(function, argument, std::nullopt, std::nullopt, static_cast<double>(index),
                          "between 0 and " + std::to_string(size - 1));
    }
}

}  // namespace steelyard::engine
