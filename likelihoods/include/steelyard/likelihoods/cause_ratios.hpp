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
/// What both rows stand on cancels. A row given as ratios against b's own row is shown with the ratios'
/// interval alone; of two rows given against the same third one that one is held fixed. In a table of two
/// causes with ratios against the rest, the rest of the one is the other: the published ratio and range are
/// shown themselves, whatever the solved rows lost to rounding. With more causes the two solved rows count as
/// independent. Where the table's `least` acted on a mean and spread, shares below it count as it, so that
/// the interval has its end there.
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
