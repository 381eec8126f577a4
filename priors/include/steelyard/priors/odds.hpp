// SPDX-License-Identifier: Apache-2.0
#pragma once
// Odds as clinics write them, `1:3`, and the probability they stand for.

#include <optional>
#include <string>
#include <string_view>

namespace steelyard::priors {

/// Odds, weights and worths outside these bounds are taken for slips of the pen. The bounds also keep every
/// sum and logarithm of a prior set finite.
inline constexpr double least_given = 1e-12;
inline constexpr double most_given = 1e12;

/// Odds written as `a:b` (a to b, both above 0) or as one number above 0; spaces around the parts are
/// allowed.
/// @returns  a / b [1], in [least_given, most_given]; empty when the text is anything else. Locale-free.
std::optional<double> parse_odds(std::string_view text) noexcept;

/// Probability of odds o: o / (1 + o).
/// @param odds  [1], >= 0, finite.   @returns  [1], in [0, 1].
double probability_of_odds(double odds) noexcept;

/// Odds of a probability p: p / (1 - p).
/// @param probability  [1], in [0, 1).   @returns  [1], >= 0.
double odds_of_probability(double probability) noexcept;

/// Odds in readable form to three significant digits, the smaller side being 1: `1:3.4`, `2.33:1`, `1:1`.
///
/// The text reads back through parse_odds() to within half a percent of the odds.
/// @param odds  [1]; above 0; a value outside [least_given, most_given] is printed as the nearer bound.
std::string odds_text(double odds);

}  // namespace steelyard::priors
