// SPDX-License-Identifier: Apache-2.0
#pragma once
// Comparing numbers with stated tolerances. NaN is near nothing but NaN; infinities are near themselves only.

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace steelyard::test {

/// |actual - expected| <= tolerance * |expected| + 1e-300.
inline ::testing::AssertionResult near_rel(double expected, double actual, double tolerance) {
    if (std::isnan(expected) && std::isnan(actual)) {
        return ::testing::AssertionSuccess();
    }
    if (expected == actual || std::abs(actual - expected) <= tolerance * std::abs(expected) + 1e-300) {
        return ::testing::AssertionSuccess();
    }
    return ::testing::AssertionFailure()
           << "expected " << ::testing::PrintToString(expected) << ", got "
           << ::testing::PrintToString(actual) << ", relative difference "
           << std::abs(actual - expected) / std::abs(expected) << " over " << tolerance;
}

/// |actual - expected| <= tolerance.
inline ::testing::AssertionResult near_abs(double expected, double actual, double tolerance) {
    if (std::isnan(expected) && std::isnan(actual)) {
        return ::testing::AssertionSuccess();
    }
    if (expected == actual || std::abs(actual - expected) <= tolerance) {
        return ::testing::AssertionSuccess();
    }
    return ::testing::AssertionFailure() << "expected " << ::testing::PrintToString(expected) << ", got "
                                         << ::testing::PrintToString(actual) << ", difference "
                                         << std::abs(actual - expected) << " over " << tolerance;
}

/// Within n units in the last place of the expected value.
inline ::testing::AssertionResult near_ulps(double expected, double actual, int n) {
    return near_rel(expected, actual, n * std::numeric_limits<double>::epsilon());
}

}  // namespace steelyard::test
