// SPDX-License-Identifier: Apache-2.0
#pragma once
// Probabilities of intervals and tails of the normal and Student's t law, each taken on the side where it is
// small so that far tails keep their relative accuracy. Evaluated by Boost.Math in long double.
// docs/method.md, "Numerics".

namespace steelyard::engine {

/// P(Z <= z) of the standard normal law. @param z  [1], not NaN; infinities allowed   @throws DomainError
[[nodiscard]] double normal_lower(double z);

/// P(Z > z) of the standard normal law. Same domain.
[[nodiscard]] double normal_upper(double z);

/// The z with P(Z <= z) = p. @param p  [1], in (0, 1)   @throws DomainError
[[nodiscard]] double normal_quantile(double p);

/// P(T > t) of Student's t with `degrees` degrees of freedom.
/// @param t  [1], not NaN; infinities allowed   @param degrees  [1], finite, > 0, need not be whole   @throws
/// DomainError
[[nodiscard]] double student_t_upper(double t, double degrees);

/// The t with P(T <= t) = p. @param p  [1], in (0, 1)   @param degrees  [1], finite, > 0   @throws
/// DomainError
[[nodiscard]] double student_t_quantile(double p, double degrees);

}  // namespace steelyard::engine
