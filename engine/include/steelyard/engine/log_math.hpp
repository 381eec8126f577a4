// SPDX-License-Identifier: Apache-2.0
#pragma once
// Sums of exponentials without overflow, and sums of numbers without lost digits. docs/method.md, "Numerics".
//
//   input               log_sum_exp   softmax                compensated_sum
//   empty               -inf          empty                  0
//   one element x       x             1                      x
//   n equal elements x  x + ln n      1/n each               n x, rounded once
//   some -inf           left out      0 there                -inf
//   all -inf            -inf          DomainError            -inf
//   any +inf            +inf          DomainError            +inf (NaN with -inf beside it)
//   any NaN             NaN           DomainError            NaN
//
// softmax refuses what has no answer: all -inf says that every cause is impossible, and there is nothing to
// share out.

#include <Eigen/Core>

namespace steelyard::engine {

/// ln of the sum of e^x_i, shifted by the largest x so that nothing overflows.
/// @param x  [nats], shape (N), N >= 0; the edges are in the table above.
[[nodiscard]] double log_sum_exp(const Eigen::Ref<const Eigen::ArrayXd>& x);

/// e^x_i divided by their sum.
/// @param x   [nats], shape (N); -inf allowed, but not everywhere.
/// @returns   shape (N); each in [0, 1]; |sum - 1| <= N * 2^-52.
/// @throws DomainError  an entry is NaN or +inf, or all are -inf.
[[nodiscard]] Eigen::ArrayXd softmax(const Eigen::Ref<const Eigen::ArrayXd>& x);

/// ln(1 - e^x): the log probability of the opposite of an event with log probability x. Switches at -ln 2
/// between ln(-expm1(x)) and log1p(-e^x) (Machler, Accurately computing log(1 - exp(-|a|)), 2012; from
/// memory).
/// @param x  [nats], <= 0; 0 gives -inf, -inf gives 0   @throws DomainError  x > 0 or NaN
[[nodiscard]] double log1m_exp(double x);

/// The sum with the rounding errors of every step carried along (Neumaier 1974). Unlike Kahan's it survives a
/// term larger than the running sum: 1 + 1e100 + 1 - 1e100 is 2.
[[nodiscard]] double compensated_sum(const Eigen::Ref<const Eigen::ArrayXd>& x);

}  // namespace steelyard::engine
