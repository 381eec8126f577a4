// SPDX-License-Identifier: Apache-2.0
#pragma once
// The rank of a cause in a pattern's forecast, ties resolved by the order of the causes.

#include <Eigen/Core>

namespace steelyard::engine {

/// How many causes stand before `cause` in row g: those with a larger forecast, and earlier ones with an
/// equal one (within 1e-12 nats). The leader has none before it.
inline Eigen::Index causes_before(const Eigen::ArrayXXd& log_forecast, Eigen::Index leader, Eigen::Index g,
                                  Eigen::Index cause) {
    if (cause == leader) {
        return 0;
    }
    constexpr double tie = 1e-12;
    const double own = log_forecast(g, cause);
    Eigen::Index before = 1;  // the leader
    for (Eigen::Index k = 0; k < log_forecast.cols(); ++k) {
        if (k != cause && k != leader) {
            const double ahead = log_forecast(g, k) - own;
            before += ahead > tie || (k < cause && ahead >= -tie) ? 1 : 0;
        }
    }
    return before;
}

}  // namespace steelyard::engine
