// SPDX-License-Identifier: Apache-2.0
#pragma once
// One cause against all others together: what stays fixed while that one's prior or row moves.

#include <Eigen/Core>
#include <string_view>

namespace steelyard::engine {

struct OneAgainstOthers {
    double log_prior_odds = 0.0;  ///< of the one against the others together [nats]
    double log_bayes = 0.0;       ///< ln l_one - ln (mean likelihood of the others by their prior) [nats]
    /// ln of each other cause's part in the posterior of the others together [nats]; shape (K); -inf at the
    /// one.
    Eigen::ArrayXd log_share;

    double log_posterior_odds() const { return log_prior_odds + log_bayes; }
};

/// Checks shapes (K >= 2), that every entry is finite and the cause is in [0, K), in the name of `function`;
/// `argument` is what the caller calls the one.
/// @throws DomainError  also when a difference overflows
OneAgainstOthers one_against_others(std::string_view function,
                                    const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                    const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, Eigen::Index one,
                                    std::string_view argument = "cause");

}  // namespace steelyard::engine
