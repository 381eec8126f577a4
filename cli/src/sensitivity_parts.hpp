// SPDX-License-Identifier: Apache-2.0
#pragma once
// The parts of a sensitivity report, each a function of the case.

#include "case_model.hpp"
#include "steelyard/cli/sensitivity.hpp"
#include "steelyard/engine/prior_range.hpp"
#include "uncertain_case.hpp"

namespace steelyard::cli {

PerCause per_cause(const Eigen::Ref<const Eigen::ArrayXd>& values);

/// What the stated ranges allow.
struct StatedRange {
    std::vector<CauseRange> range;
    bool narrowed = false;
};
/// The exact range of each posterior when every prior moves within its stated range; empty when none is
/// stated.
StatedRange stated_range(const CaseModel& model, const priors::PriorSet& priors,
                         const Eigen::ArrayXd& log_likelihood);
std::vector<CauseRange> cause_ranges(const engine::PosteriorRange& range);

/// Whether any cause predicts what was seen, and whether the findings go together.
Fit fit_of(const CaseModel& model, const Weighing& weighing, std::uint64_t seed);

/// Shares of the variance of the leader's posterior, by the priors and by each table, largest total first.
std::vector<VarianceSource> variance_by_source(const CaseModel& model, const UncertainCase& uncertain,
                                               const engine::UncertainPosterior& posterior,
                                               const likelihoods::Pattern& pattern, Eigen::Index leader,
                                               std::uint64_t seed, int threads);

/// What each finding not yet known may be expected to tell: fills `next`, `pair` and `plan`.
void find_next_tests(const CaseModel& model, const Weighing& weighing, const std::string& burden,
                     Sensitivity& sensitivity);

/// Burdens from the lightest to the heaviest.
const std::vector<std::string>& burdens();

}  // namespace steelyard::cli
