// SPDX-License-Identifier: Apache-2.0
#pragma once
// What findings do to each other: of alternatives one is read, and the members of a group share their weight.

#include <vector>

#include "steelyard/likelihoods/pattern.hpp"

namespace steelyard::likelihoods::detail {

/// Settles alternatives, then the weights of groups. @param findings  one per table, in the order of the set
void arrange(const TableSet& set, std::vector<FindingReading>& findings);

/// Undoes arrange(): every finding stands as if it were alone.
void take_apart(std::vector<FindingReading>& findings);

}  // namespace steelyard::likelihoods::detail
