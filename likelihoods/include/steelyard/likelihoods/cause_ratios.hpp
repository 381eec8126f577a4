// SPDX-License-Identifier: Apache-2.0
#pragma once
// Likelihood ratios of one cause against another, band by band, with intervals: for display. Rows are kept
// per cause, so a ratio for any pair is derived, and none has to be published.

#include <string_view>
#include <vector>

#include "steelyard/engine/proportion.hpp"
#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods {

/// P(band | a) / P(band | b) for each band of a table, with the equal-tailed interval of both rows'
/// uncertainty.
///
/// A row given as ratios against b's own row is shown with the ratios' interval alone: what is not known of b
/// cancels.
///
/// @param a, b   causes of the set, composites included; a cause against itself, or against one whose row it
/// takes,
///               gives 1 without an interval
/// @param level  in (0, 1)
/// @throws std::out_of_range   a cause is not of the set
/// @throws engine::DomainError  level
std::vector<engine::IntervalEstimate> cause_ratios(const TableSet& set, const EvidenceTable& table,
                                                   std::string_view a, std::string_view b,
                                                   double level = 0.95);

}  // namespace steelyard::likelihoods
