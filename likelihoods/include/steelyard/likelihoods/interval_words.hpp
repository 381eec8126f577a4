// SPDX-License-Identifier: Apache-2.0
#pragma once
// What is known of a value, in words: a limit reads as the laboratory wrote it.

#include <functional>
#include <string>
#include <string_view>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::likelihoods {

/// `2.8`, `below 5`, `at most 5`, `above 20`, `20 or more`, `3 to 5`; `not known` when neither end is a
/// measurement. A floor or ceiling is never shown.
///
/// @param digits  significant digits at most, > 0; trailing zeros are dropped
std::string interval_in_words(const Interval& value, int digits);

/// The same with the caller's way of writing a number, and a unit behind the last one.
///
/// @param number  writes one finite number
/// @param unit    with its leading blank, ` mmol/L`; may be empty
std::string interval_in_words(const Interval& value, const std::function<std::string(double)>& number,
                              std::string_view unit = {});

}  // namespace steelyard::likelihoods
