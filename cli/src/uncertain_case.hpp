// SPDX-License-Identifier: Apache-2.0
#pragma once
// The rows and priors of one case with their laws, for drawing.

#include "case_model.hpp"
#include "steelyard/engine/uncertain_posterior.hpp"

namespace steelyard::cli {

struct UncertainCase {
    engine::UncertainProblem problem;
    std::vector<std::size_t> findings;  ///< for each finding of the problem its index in Pattern::findings
    std::vector<const likelihoods::EvidenceRow*> rows;  ///< for each row of the problem the row of the table
};

/// How a prior set is drawn: where a cause states a range, that range is its 95 % interval; otherwise counts
/// and weights with a worth are drawn as a Dirichlet; what states neither is held. docs/method.md, "Draws".
UncertainCase uncertain_case(const CaseModel& model, const priors::PriorSet& priors,
                             const likelihoods::Pattern& pattern);

}  // namespace steelyard::cli
