// SPDX-License-Identifier: Apache-2.0
#pragma once
// Normal probabilities that keep their relative accuracy in the tails.

#include <cmath>

namespace steelyard::engine::detail {

/// P(Z > z).
inline double upper_tail(double z) {
    return 0.5 * std::erfc(z / std::sqrt(2.0));
}

/// P(low < Z < high), the difference taken on the side where both terms are small. Infinite limits are
/// allowed.
inline double normal_mass(double low, double high) {
    if (low >= 0.0) {
        return upper_tail(low) - upper_tail(high);
    }
    if (high <= 0.0) {
        return upper_tail(-high) - upper_tail(-low);
    }
    return 1.0 - upper_tail(-low) - upper_tail(high);
}

}  // namespace steelyard::engine::detail
