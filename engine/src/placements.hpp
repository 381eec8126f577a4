// SPDX-License-Identifier: Apache-2.0
#pragma once
// DeLong's placements: for each pattern, the share of the other side that it stands above or below.

#include <Eigen/Core>

namespace steelyard::engine {

struct Placements {
    double area = 0.0;
    Eigen::ArrayXd of_case;   ///< shape (G): share of the others whose forecast is lower, ties one half
    Eigen::ArrayXd of_other;  ///< shape (G): share of the cases whose forecast is higher, ties one half
};

/// @param value  forecasts; shape (G)   @param cases, others  patients; shape (G), sums > 0
[[nodiscard]] Placements placements(const Eigen::Ref<const Eigen::ArrayXd>& value,
                                    const Eigen::Ref<const Eigen::ArrayXd>& cases,
                                    const Eigen::Ref<const Eigen::ArrayXd>& others);

/// Mean of x y less the product of their means, times n / (n - 1), both weighted by patients.
[[nodiscard]] double sample_covariance(const Eigen::Ref<const Eigen::ArrayXd>& x,
                                       const Eigen::Ref<const Eigen::ArrayXd>& y,
                                       const Eigen::Ref<const Eigen::ArrayXd>& patients);

}  // namespace steelyard::engine
