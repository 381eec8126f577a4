// SPDX-License-Identifier: Apache-2.0
#pragma once
// The one error of the engine, and the guards that throw it. An argument outside a function's domain looks
// the same here whether a programmer or a data file is at fault; the caller knows which, and where it came
// from.

#include <Eigen/Core>
#include <cstddef>
#include <optional>
#include <stdexcept>
#include <string>
#include <string_view>

namespace steelyard::engine {

/// An argument outside a function's domain: which function, which argument, where in it, its value, what is
/// required.
class DomainError : public std::domain_error {
  public:
    DomainError(std::string_view function, std::string_view argument, std::optional<Eigen::Index> row,
                std::optional<Eigen::Index> column, double value, std::string_view requirement);

    const std::string& function() const noexcept { return function_; }
    const std::string& argument() const noexcept { return argument_; }
    /// 0-based row (or position in a vector) of the offending entry; empty for a scalar.
    std::optional<Eigen::Index> row() const noexcept { return row_; }
    /// 0-based column; empty for a scalar or a vector.
    std::optional<Eigen::Index> column() const noexcept { return column_; }
    double value() const noexcept { return value_; }
    const std::string& requirement() const noexcept { return requirement_; }

  private:
    std::string function_;
    std::string argument_;
    std::optional<Eigen::Index> row_;
    std::optional<Eigen::Index> column_;
    double value_;
    std::string requirement_;
};

/// A scalar in [low, high]; NaN fails. @throws DomainError
void check_between(std::string_view function, std::string_view argument, double value, double low,
                   double high);

/// A scalar that is finite and > 0. @throws DomainError
void check_positive(std::string_view function, std::string_view argument, double value);

/// Every entry is finite and in [low, high]; names the first that is not. @throws DomainError
void check_all_between(std::string_view function, std::string_view argument,
                       const Eigen::Ref<const Eigen::ArrayXXd>& values, double low, double high);

/// A size is what it must be. @throws DomainError carrying the size found
void check_size(std::string_view function, std::string_view argument, Eigen::Index found,
                Eigen::Index required);

/// Entries are >= 0 and sum to 1 within `tolerance`. @throws DomainError (the sum is the value when the sum
/// is wrong)
void check_simplex(std::string_view function, std::string_view argument,
                   const Eigen::Ref<const Eigen::ArrayXd>& values, double tolerance);

}  // namespace steelyard::engine
