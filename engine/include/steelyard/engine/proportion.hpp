// SPDX-License-Identifier: Apache-2.0
#pragma once
// A proportion x / n with a confidence interval: Wilson's score interval and the exact interval of Clopper
// and Pearson. docs/method.md, "Likelihood ratios from counts".

namespace steelyard::engine {

/// A number with the limits of its interval: low <= value <= high. A limit may be infinite where the data
/// give none.
struct IntervalEstimate {
    double value = 0.0;
    double low = 0.0;
    double high = 0.0;
};

/// The standard normal quantile z with P(-z <= Z <= z) = level. @param level  in (0, 1)  @throws DomainError
[[nodiscard]] double two_sided_normal_quantile(double level);

/// Wilson's score interval: (p + z^2/2n -/+ z sqrt(p(1-p)/n + z^2/4n^2)) / (1 + z^2/n). Newcombe, Stat Med
/// 1998;17:857, method 3.
/// @param x      cases with the mark [1]; in [0, n]; need not be whole
/// @param n      cases [1]; finite, > 0
/// @param level  coverage [1]; in (0, 1)
/// @returns      limits in [0, 1]; low is exactly 0 when x = 0 and high exactly 1 when x = n
/// @throws DomainError  names the argument out of range
[[nodiscard]] IntervalEstimate wilson_interval(double x, double n, double level = 0.95);

/// The exact interval of Clopper and Pearson: Beta quantiles, B(q; x, n - x + 1) and B(1 - q; x + 1, n - x)
/// with q = (1 - level) / 2. Parameters, guarantee and errors as wilson_interval().
[[nodiscard]] IntervalEstimate exact_interval(double x, double n, double level = 0.95);

}  // namespace steelyard::engine
