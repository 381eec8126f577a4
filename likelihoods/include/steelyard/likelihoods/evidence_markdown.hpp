// SPDX-License-Identifier: Apache-2.0
#pragma once
// The evidence of a table set as a document: what docs/evidence.md shows between its marker comments, so that
// the page cannot drift from the tables.

#include <string>
#include <string_view>

#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods {

/// The lines between which docs/evidence.md holds evidence_markdown().
inline constexpr std::string_view evidence_begin = "<!-- generated: begin -->";
inline constexpr std::string_view evidence_end = "<!-- generated: end -->";

/// Markdown of a whole set: causes, then for each finding its bands with P(band | cause) in percent, basis
/// and sources of each row, the form it was given in, conditions and caution; then groups, alternatives,
/// limits and sources. The same set always gives the same text. Characters with a meaning in Markdown or HTML
/// are escaped.
std::string evidence_markdown(const TableSet& set);

}  // namespace steelyard::likelihoods
