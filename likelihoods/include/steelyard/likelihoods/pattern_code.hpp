// SPDX-License-Identifier: Apache-2.0
#pragma once
// A pattern as a short string: what batch work counts, stores and looks up. It holds which band of which
// finding is known, before alternatives are preferred and groups share their weight, so that the same code
// can be weighed under other priors, other rows and other groups. It holds no value, no word and no name.

#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/pattern.hpp"

namespace steelyard::likelihoods {

/// One byte per table of a set, in the order of the set: `missing_state`, `aside_state`, or
/// `first_band_state` and up. Of a quantity or feature the states after it are its bands; of a joint table
/// its cells, then the bands of the first finding alone, then those of the second alone.
using PatternCode = std::string;
inline constexpr unsigned char missing_state = 0;
inline constexpr unsigned char aside_state = 1;
inline constexpr unsigned char first_band_state = 2;

/// How many states a table has, the first two among them. @throws std::length_error  more than 256
int states_of(const EvidenceTable& table);

/// The same for every table of a set, in its order.
std::vector<int> states_of(const TableSet& set);

/// @param pattern  as read_pattern() gives it
PatternCode code_of(const TableSet& set, const Pattern& pattern);

/// The pattern of a code: what is read and with which weight. It has no values and no reasons.
/// @throws std::out_of_range  the code is not of this set
Pattern pattern_of(const TableSet& set, std::string_view code);

/// A code in characters: for each table `.` for missing, `x` for set aside, else the number of its state from
/// 0 as a digit of base 62 (0-9, A-Z, a-z without x, _), two digits where the table has more than 62.
std::string code_in_characters(const TableSet& set, std::string_view code);
/// The inverse; empty when the text is none of this set.
std::optional<PatternCode> code_from_characters(const TableSet& set, std::string_view text);
/// Both from the number of states alone: how a code is written depends on nothing else of the set.
/// @param states  states_of() each table
std::string code_in_characters(const std::vector<int>& states, std::string_view code);
std::optional<PatternCode> code_from_characters(const std::vector<int>& states, std::string_view text);

/// A digest of all that decides which bands a panel is read in: findings, bands, conditions of use, gate. Two
/// sets that differ only in their rows, groups or alternatives have the same one, and patterns of the one
/// mean the same under the other.
std::string reading_digest(const TableSet& set);

}  // namespace steelyard::likelihoods
