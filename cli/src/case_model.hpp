// SPDX-License-Identifier: Apache-2.0
#pragma once
// One weighed case as arrays: what every question about its answer starts from.

#include <Eigen/Core>
#include <string>
#include <vector>

#include "steelyard/cli/weighing.hpp"

namespace steelyard::cli {

class CaseModel {
  public:
    CaseModel(const likelihoods::TableSet& tables, const std::vector<WeighedCause>& causes);

    const likelihoods::TableSet& tables() const noexcept { return *tables_; }
    const std::vector<std::string>& causes() const noexcept { return causes_; }
    /// ln prior probability; shape (K) [nats].
    const Eigen::ArrayXd& log_prior() const noexcept { return log_prior_; }
    /// P(band | cause) of a table and its logarithm; shape (bands, K).
    const Eigen::ArrayXXd& shares(std::size_t table) const { return shares_.at(table); }
    const Eigen::ArrayXXd& log_shares(std::size_t table) const { return log_shares_.at(table); }

    /// What a pattern of this case, or of one like it, gives the engine: as log_likelihood_rows() and
    /// row_weights() do.
    struct Evidence {
        Eigen::ArrayXXd loglik;  ///< ln P(what was seen | cause) of the findings read; shape (F, K) [nats]
        Eigen::ArrayXd weight;   ///< shape (F)
        /// Weighed sum over the findings; shape (K) [nats].
        Eigen::ArrayXd log_likelihood() const;
    };
    Evidence evidence(const likelihoods::Pattern& pattern) const;
    /// ln P(what was seen | cause) of one finding that is read; shape (K) [nats].
    Eigen::ArrayXd line(const likelihoods::FindingReading& reading) const;
    Eigen::ArrayXd posterior(const likelihoods::Pattern& pattern) const;

  private:
    const likelihoods::TableSet* tables_;
    std::vector<std::string> causes_;
    Eigen::ArrayXd log_prior_;
    std::vector<Eigen::ArrayXXd> shares_, log_shares_;
};

/// The index of the largest entry; of equal ones the first.
Eigen::Index leader_of(const Eigen::ArrayXd& values);

}  // namespace steelyard::cli
