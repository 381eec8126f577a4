// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/proportion.hpp"

#include <algorithm>
#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/erf.hpp>
#include <cmath>
#include <optional>
#include <string_view>

#include "steelyard/engine/boost_policy.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

void check_proportion(std::string_view function, double x, double n) {
    check_positive(function, "n", n);
    check_between(function, "x", x, 0.0, n);
}

void check_level(std::string_view function, double level) {
    if (!(level > 0.0 && level < 1.0)) {
        throw DomainError(function, "level", std::nullopt, std::nullopt, level, "above 0 and below 1");
    }
}

}  // namespace

double two_sided_normal_quantile(double level) {
    check_level("two_sided_normal_quantile", level);
    return std::sqrt(2.0) * boost::math::erfc_inv(1.0 - level, BoostPolicy());
}

IntervalEstimate wilson_interval(double x, double n, double level) {
    check_proportion("wilson_interval", x, n);
    check_level("wilson_interval", level);
    const double z = two_sided_normal_quantile(level);
    const double p = x / n;
    const double centre = p + z * z / (2.0 * n);
    const double half = z * std::sqrt(p * (1.0 - p) / n + z * z / (4.0 * n * n));
    const double scale = 1.0 + z * z / n;
    // At the ends the two terms cancel exactly on paper but not in binary, so the limit is set.
    const double low = x == 0.0 ? 0.0 : std::max(0.0, (centre - half) / scale);
    const double high = x == n ? 1.0 : std::min(1.0, (centre + half) / scale);
    return {p, std::min(low, p), std::max(high, p)};
}

IntervalEstimate exact_interval(double x, double n, double level) {
    check_proportion("exact_interval", x, n);
    check_level("exact_interval", level);
    const double q = (1.0 - level) / 2.0;
    const auto lower = [](double a, double b, double tail) {
        return boost::math::ibeta_inv(a, b, tail, BoostPolicy());
    };
    const auto upper = [](double a, double b, double tail) {
        return boost::math::ibetac_inv(a, b, tail, BoostPolicy());
    };
    return with_boost("exact_interval", "x", x, [&] {
        return IntervalEstimate{x / n, x == 0.0 ? 0.0 : lower(x, n - x + 1.0, q),
                                x == n ? 1.0 : upper(x + 1.0, n - x, q)};
    });
}

}  // namespace steelyard::engine
