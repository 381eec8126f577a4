// SPDX-License-Identifier: Apache-2.0
#include "case_model.hpp"

#include <algorithm>
#include <cmath>

#include "steelyard/engine/posterior.hpp"

namespace steelyard::cli {

using likelihoods::FindingReading;
using likelihoods::Use;

CaseModel::CaseModel(const likelihoods::TableSet& tables, const std::vector<WeighedCause>& causes)
    : tables_(&tables) {
    log_prior_.resize(static_cast<Eigen::Index>(causes.size()));
    for (const WeighedCause& cause : causes) {
        log_prior_(static_cast<Eigen::Index>(causes_.size())) = std::log(cause.prior);
        causes_.push_back(cause.id);
    }
    for (const likelihoods::EvidenceTable& table : tables.tables) {
        shares_.push_back(likelihoods::band_probabilities(tables, table, causes_));
        log_shares_.emplace_back(shares_.back().log());
    }
}

Eigen::ArrayXd CaseModel::line(const FindingReading& reading) const {
    if (reading.cells.size() == 1) {
        return log_shares(reading.table).row(reading.cells.front()).transpose();
    }
    Eigen::ArrayXd seen = Eigen::ArrayXd::Zero(log_prior_.size());
    for (const Eigen::Index cell : reading.cells) {
        seen += shares(reading.table).row(cell).transpose();
    }
    // A margin is a sum of probabilities and may pass 1 by a rounding; its logarithm must not be above 0.
    return seen.min(1.0).log();
}

CaseModel::Evidence CaseModel::evidence(const likelihoods::Pattern& pattern) const {
    const auto read = std::count_if(pattern.findings.begin(), pattern.findings.end(),
                                    [](const FindingReading& reading) { return reading.use == Use::read; });
    Evidence evidence{Eigen::ArrayXXd(read, log_prior_.size()), Eigen::ArrayXd(read)};
    Eigen::Index at = 0;
    for (const FindingReading& reading : pattern.findings) {
        if (reading.use == Use::read) {
            evidence.loglik.row(at) = line(reading).transpose();
            evidence.weight(at) = reading.weight;
            ++at;
        }
    }
    return evidence;
}

Eigen::ArrayXd CaseModel::Evidence::log_likelihood() const {
    return (loglik.colwise() * weight).colwise().sum().transpose();
}

Eigen::ArrayXd CaseModel::posterior(const likelihoods::Pattern& pattern) const {
    const Evidence seen = evidence(pattern);
    return engine::posterior(log_prior_, seen.loglik, seen.weight);
}

Eigen::Index leader_of(const Eigen::ArrayXd& values) {
    Eigen::Index leader = 0;
    values.maxCoeff(&leader);
    return leader;
}

}  // namespace steelyard::cli
