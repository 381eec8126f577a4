// SPDX-License-Identifier: Apache-2.0
#pragma once
// Points that fill the unit cube more evenly than random ones: the Sobol' sequence in Gray-code order with
// the direction numbers of Joe and Kuo (SIAM J Sci Comput 2008;30:2635, from memory), computed by
// Boost.Random on a grid of 2^-32. The first point is the origin and is kept: without it 2^m points are not
// balanced. docs/method.md, "Shares of the variance".

#include <Eigen/Core>
#include <cstdint>

namespace steelyard::engine {

/// One 32-bit word per dimension.
using DigitalShift = Eigen::Array<std::uint32_t, Eigen::Dynamic, 1>;

inline constexpr Eigen::Index most_sobol_dimensions = 3667;    ///< of Boost 1.74's table
inline constexpr Eigen::Index most_sobol_points = 2147483648;  ///< 2^31

/// The first n points as they are: x 2^-32 of the 32-bit grid.
/// @param n           in [1, 2^31]; a power of 2 is best balanced
/// @param dimensions  in [1, 3667]
/// @returns           shape (n, dimensions); each in [0, 1), exact   @throws DomainError
[[nodiscard]] Eigen::ArrayXXd sobol_points(Eigen::Index n, Eigen::Index dimensions);

/// The first n points, each coordinate's 32 bits changed where its word of `shift` has a 1: random words make
/// each point uniform and keep the balance, so results of several shifts show their own error. Mapped by
/// (x + 1/2) 2^-32, which is never 0 or 1, so that quantiles stay finite.
/// @param shift  shape (D), D in [1, 3667], one word per dimension; words of 0 shift nothing but still map
///               by (x + 1/2) 2^-32
/// @returns      shape (n, D); each in (0, 1), exact   @throws DomainError
[[nodiscard]] Eigen::ArrayXXd sobol_points(Eigen::Index n, const DigitalShift& shift);

}  // namespace steelyard::engine
