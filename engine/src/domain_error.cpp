// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/domain_error.hpp"

#include <array>
#include <charconv>
#include <cmath>
#include <limits>

namespace steelyard::engine {
namespace {

std::string number(double value) {
    if (std::isnan(value)) {
        return "nan";
    }
    if (std::isinf(value)) {
        return value > 0 ? "inf" : "-inf";
    }
    std::array<char, 32> text{};
    auto* const end = std::to_chars(text.data(), text.data() + text.size(), value).ptr;
    return {text.data(), end};
}

std::string sentence(std::string_view function, std::string_view argument, std::optional<Eigen::Index> row,
                     std::optional<Eigen::Index> column, double value, std::string_view requirement) {
    std::string text;
    text.append(function).append(": ").append(argument);
    if (row && column) {
        text += "(" + std::to_string(*row) + ", " + std::to_string(*column) + ")";
    } else if (row) {
        text += "(" + std::to_string(*row) + ")";
    }
    text.append(" is ").append(number(value)).append(", but must be ").append(requirement);
    return text;
}

std::string range_words(double low, double high) {
    constexpr double infinity = std::numeric_limits<double>::infinity();
    if (low == -infinity && high == infinity) {
        return "finite";
    }
    if (high == infinity) {
        return "finite and >= " + number(low);
    }
    if (low == -infinity) {
        return "finite and <= " + number(high);
    }
    return "between " + number(low) + " and " + number(high);
}

}  // namespace

DomainError::DomainError(std::string_view function, std::string_view argument,
                         std::optional<Eigen::Index> row, std::optional<Eigen::Index> column, double value,
                         std::string_view requirement)
    : std::domain_error(sentence(function, argument, row, column, value, requirement)),
      function_(function),
      argument_(argument),
      row_(row),
      column_(column),
      value_(value),
      requirement_(requirement) {}

void check_between(std::string_view function, std::string_view argument, double value, double low,
                   double high) {
    if (!(std::isfinite(value) && low <= value && value <= high)) {
        throw DomainError(function, argument, std::nullopt, std::nullopt, value, range_words(low, high));
    }
}

void check_positive(std::string_view function, std::string_view argument, double value) {
    if (!(std::isfinite(value) && value > 0)) {
        throw DomainError(function, argument, std::nullopt, std::nullopt, value, "finite and > 0");
    }
}

void check_all_between(std::string_view function, std::string_view argument,
                       const Eigen::Ref<const Eigen::ArrayXXd>& values, double low, double high) {
    for (Eigen::Index column = 0; column < values.cols(); ++column) {
        for (Eigen::Index row = 0; row < values.rows(); ++row) {
            const double value = values(row, column);
            if (!(std::isfinite(value) && low <= value && value <= high)) {
                const auto named_column =
                    values.cols() == 1 ? std::nullopt : std::optional<Eigen::Index>(column);
                throw DomainError(function, argument, row, named_column, value, range_words(low, high));
            }
        }
    }
}

void check_size(std::string_view function, std::string_view argument, Eigen::Index found,
                Eigen::Index required) {
    if (found != required) {
        throw DomainError(function, std::string(argument) + " size", std::nullopt, std::nullopt,
                          static_cast<double>(found), std::to_string(required));
    }
}

void check_simplex(std::string_view function, std::string_view argument,
                   const Eigen::Ref<const Eigen::ArrayXd>& values, double tolerance) {
    check_all_between(function, argument, values, 0.0, std::numeric_limits<double>::infinity());
    const double sum = values.sum();
    if (!(std::abs(sum - 1.0) <= tolerance)) {
        throw DomainError(function, std::string(argument) + " sum", std::nullopt, std::nullopt, sum,
                          "1 within " + number(tolerance));
    }
}

}  // namespace steelyard::engine
