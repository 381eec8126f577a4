// SPDX-License-Identifier: Apache-2.0
#pragma once
// Forecasts in order, those that count as equal together.

#include <Eigen/Core>
#include <vector>

namespace steelyard::engine {

/// Positions 0..G-1 in increasing order of a value, cut into groups of equal ones.
struct TieGroups {
    std::vector<Eigen::Index> order;  ///< positions; equal values in their own order
    std::vector<Eigen::Index> ends;   ///< of each group, one past its last place in `order`
};

/// Values are equal when they are within 1e-11 max(1, |value|) of the smallest of their group.
/// @param value  shape (G); not NaN
[[nodiscard]] TieGroups tie_groups(const Eigen::Ref<const Eigen::ArrayXd>& value);

}  // namespace steelyard::engine
