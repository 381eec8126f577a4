// SPDX-License-Identifier: Apache-2.0
#pragma once
// A formula over inputs that are known only to lie in intervals.

#include <functional>
#include <optional>
#include <vector>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::likelihoods {

using Formula = std::function<double(const std::vector<double>&)>;

/// The values a formula takes over a box of independent inputs.
///
/// A formula that is monotone in each input while the others are held has its extremes at the box's corners,
/// whichever way it runs. An end of the result is open when every corner that attains it has an open end of
/// some input; it is a floor or ceiling when every such corner has one.
///
/// @param box  one interval per argument, finite ends; shape (n), n <= 16
/// @returns    the interval, or empty when the formula is not finite at some corner. Cost 2^(inputs that are
/// no points).
std::optional<Interval> image_of_box(const std::vector<Interval>& box, const Formula& formula);

}  // namespace steelyard::likelihoods
