// SPDX-License-Identifier: Apache-2.0
#pragma once
// From counted wins of pairs of patients to areas and their mean.

#include <Eigen/Core>
#include <limits>

namespace steelyard::engine {

struct HandTill {
    double mean = std::numeric_limits<double>::quiet_NaN();
    Eigen::Index pairs = 0;  ///< pairs of causes that both have cases
};

/// Divides wins by pairs of patients, in place (NaN where there are none), and gives the mean.
/// @param area  shape (K, K), as AreaOrder::wins()   @param cases  shape (K)
inline HandTill hand_till(Eigen::ArrayXXd& area, const Eigen::Ref<const Eigen::ArrayXd>& cases) {
    HandTill result;
    double sum = 0.0;
    for (Eigen::Index j = 0; j < cases.size(); ++j) {
        for (Eigen::Index i = 0; i < cases.size(); ++i) {
            const bool both = i != j && cases(i) > 0.0 && cases(j) > 0.0;
            area(i, j) = both ? area(i, j) / (cases(i) * cases(j)) : std::numeric_limits<double>::quiet_NaN();
            if (both && i < j) {
                ++result.pairs;
            }
            sum += both ? area(i, j) : 0.0;
        }
    }
    if (result.pairs > 0) {
        result.mean = sum / (2.0 * static_cast<double>(result.pairs));
    }
    return result;
}

}  // namespace steelyard::engine
