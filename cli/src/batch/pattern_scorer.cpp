// SPDX-License-Identifier: Apache-2.0
#include "pattern_scorer.hpp"

#include "steelyard/engine/log_math.hpp"
#include "steelyard/engine/posterior.hpp"

namespace steelyard::cli {

PatternScorer::PatternScorer(const likelihoods::TableSet& tables, const std::vector<WeighedCause>& causes)
    : tables_(tables), model_(tables, causes) {}

PatternScore PatternScorer::score(std::string_view code) const {
    const likelihoods::Pattern pattern = likelihoods::pattern_of(tables_, code);
    const CaseModel::Evidence seen = model_.evidence(pattern);
    const Eigen::ArrayXd scores = engine::log_scores(model_.log_prior(), seen.loglik, seen.weight);
    const Eigen::ArrayXd posterior = engine::softmax(scores);
    PatternScore score;
    score.posterior.assign(posterior.begin(), posterior.end());
    score.leader = ranked(scores).front();
    for (const likelihoods::FindingReading& reading : pattern.findings) {
        if (reading.use == likelihoods::Use::set_aside) {
            score.aside.push_back(reading.table);
        }
    }
    return score;
}

}  // namespace steelyard::cli
