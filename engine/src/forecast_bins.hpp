// SPDX-License-Identifier: Apache-2.0
#pragma once
// Bins of equal width, for everything that cuts forecasts into bins.

#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <string_view>

#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {

/// Bin of p of `bins` bins: b/B <= p < (b + 1)/B as written in decimals, p = 1 in the last.
inline Eigen::Index bin_of(double p, Eigen::Index bins) {
    const double place = std::floor(p * static_cast<double>(bins) + 1e-9);
    return std::min(static_cast<Eigen::Index>(place), bins - 1);
}

/// @throws DomainError
inline void check_bins(std::string_view function, Eigen::Index bins) {
    check_between(function, "bins", static_cast<double>(bins), 1.0, 1000.0);
}

}  // namespace steelyard::engine
