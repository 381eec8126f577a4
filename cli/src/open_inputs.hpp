// SPDX-License-Identifier: Apache-2.0
#pragma once
// Opening what a command names, so that the faults of all inputs are told in one run.

#include <optional>
#include <stdexcept>
#include <string>
#include <vector>

#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::cli {

/// A mistake on the command line that the option parser cannot see; exit code 2.
class UsageError : public std::runtime_error {
  public:
    using std::runtime_error::runtime_error;
};

/// A table set, or empty with its faults added.
std::optional<likelihoods::TableSet> open_tables(const std::string& name, document::Diagnostics& faults);

/// A prior set, or empty with its faults added.
std::optional<priors::PriorSet> open_priors(const std::string& name,
                                            const std::vector<std::string>& known_causes,
                                            document::Diagnostics& faults);

/// A prior set that names a composite cause must name its parts too: otherwise a patient with one part alone
/// would have to be given the composite. composite_without_parts at the composite's line.
void check_composites(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                      document::Diagnostics& faults);

std::vector<std::string> cause_ids(const likelihoods::TableSet& tables);

/// `; did you mean X?`, or `; there are: A, B, ...`.
std::string suggestion(const std::string& word, const std::vector<std::string>& known);

}  // namespace steelyard::cli
