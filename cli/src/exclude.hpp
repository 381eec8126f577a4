// SPDX-License-Identifier: Apache-2.0
#pragma once
// Causes left out on the command line.

#include <string>
#include <vector>

#include "steelyard/likelihoods/table_set.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::cli {

/// The prior set less the causes excluded on the command line.
/// @throws UsageError  the tables have no such cause, or fewer than two remain
priors::PriorSet without_excluded(const priors::PriorSet& set, const likelihoods::TableSet& tables,
                                  const std::vector<std::string>& excluded);

}  // namespace steelyard::cli
