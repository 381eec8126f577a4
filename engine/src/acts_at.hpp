// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether a forecast reaches a threshold.

#include <cmath>

namespace steelyard::engine {

/// p >= t; a forecast that was written as the threshold itself reaches it, though its logarithm was rounded.
inline bool acts_at(double log_forecast, double threshold) {
    return log_forecast >= std::log(threshold) - 1e-12;
}

}  // namespace steelyard::engine
