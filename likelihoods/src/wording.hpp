// SPDX-License-Identifier: Apache-2.0
#pragma once
// How numbers, units and titles are put into sentences that a clinician reads.

#include <string>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::likelihoods::detail {

/// ` mmHg` for `mm[Hg]`, with the leading blank; nothing for a pH or a plain ratio.
std::string unit_after_number(std::string_view ucum);

/// A value computed or converted: six significant digits, so that rounding noise is not shown.
std::string shown(double value);

/// `below 5 mmol/L`, `above 5 mmol/L`, `between 3 and 5 mmol/L`, or the value itself.
std::string shown(const Interval& value, std::string_view ucum);

/// A title inside a sentence: `Urine pH` becomes `urine pH`; `GFR` stays.
std::string in_sentence(std::string_view title);

/// A level of a feature for people: `not_depleted` becomes `not depleted`.
std::string level_in_words(std::string_view level);

/// `a, b and c`.
std::string listed_in_words(const std::vector<std::string>& items);

/// `two`, `three`, ... up to ten, then digits.
std::string count_in_words(std::size_t count);

}  // namespace steelyard::likelihoods::detail
