// SPDX-License-Identifier: Apache-2.0
#pragma once
// The root of a decreasing function: bracketed by doubling steps, then TOMS 748 (Alefeld, Potra and Shi
// 1995).

#include <algorithm>
#include <boost/math/tools/toms748_solve.hpp>
#include <cmath>
#include <cstdint>

namespace steelyard::engine::detail {

/// Root of f in [low, high], where f(low) >= 0 >= f(high). Found to about 2^-51 of max(1, |root|).
template <class Function>
double root_between(const Function& f, double low, double high) {
    const double at_low = f(low);
    const double at_high = f(high);
    if (at_low <= 0.0) {
        return low;
    }
    if (at_high >= 0.0) {
        return high;
    }
    std::uintmax_t steps = 200;
    const auto close = [](double a, double b) {
        return std::abs(b - a) <= 0x1p-51 * std::max(1.0, std::max(std::abs(a), std::abs(b)));
    };
    const auto [left, right] = boost::math::tools::toms748_solve(f, low, high, at_low, at_high, close, steps);
    return left + 0.5 * (right - left);
}

/// Root of a decreasing f on the whole line, looked for around `start` in steps that double. When f keeps its
/// sign over [start - 2^20 step, start + 2^20 step] the end reached is returned.
template <class Function>
double root_of_decreasing(const Function& f, double start, double step) {
    constexpr int doublings = 20;
    double low = start;
    double high = start;
    if (f(start) >= 0.0) {
        double width = step;
        for (int i = 0; i < doublings && f(high = low + width) > 0.0; ++i) {
            low = high;
            width *= 2.0;
        }
    } else {
        double width = step;
        for (int i = 0; i < doublings && f(low = high - width) < 0.0; ++i) {
            high = low;
            width *= 2.0;
        }
    }
    return root_between(f, low, high);
}

}  // namespace steelyard::engine::detail
