// SPDX-License-Identifier: Apache-2.0
#pragma once
// The scores of the causes before rounding, shared by posterior.cpp and ledger.cpp.

#include <Eigen/Core>
#include <cstddef>
#include <string_view>
#include <vector>

#include "exact_sum.hpp"

namespace steelyard::engine {

struct ExactScores {
    std::vector<ExactSum> score;  ///< shape (K): log prior plus weighted log-likelihoods [nats]
    std::size_t leader = 0;       ///< the first of the largest

    /// Scores minus the leader's, each rounded once [nats].
    Eigen::ArrayXd below_leader() const;
};

/// Checks the arguments in the name of `function`, then sums. @throws DomainError as log_scores()
ExactScores exact_scores(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                         const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                         const Eigen::Ref<const Eigen::ArrayXd>& weight);

}  // namespace steelyard::engine
