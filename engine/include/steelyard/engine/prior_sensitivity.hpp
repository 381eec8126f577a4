// SPDX-License-Identifier: Apache-2.0
#pragma once
// How far a prior would have to move. One cause's prior probability varies; all others keep their proportions
// to each other. Everything is closed form and stays in logs, so a prior of 1e-400 has an answer too.
// docs/method.md, "Moving one prior".
//
// Arguments shared by all functions here:
//   log_prior       log prior weights [nats], up to one shared constant; shape (K), K >= 2; finite
//   log_likelihood  weighted sum of all findings per cause [nats], up to one shared constant; shape (K);
//                   finite
//   cause           in [0, K)
// All throw DomainError when a shape or an entry is not as stated, or when a difference overflows.

#include <Eigen/Core>

#include "steelyard/engine/index.hpp"
#include "steelyard/engine/log_weight.hpp"
#include "steelyard/engine/probability.hpp"

namespace steelyard::engine {

/// The log prior with `cause` moved to the given odds against all others together, the others in proportion.
/// @param odds  finite
/// @returns     shape (K) [nats]; the exponentials sum to 1
[[nodiscard]] Eigen::ArrayXd with_prior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior, CauseIndex cause,
                                        LogOdds odds);

/// The same, said as a probability in (0, 1).
[[nodiscard]] Eigen::ArrayXd with_prior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior, CauseIndex cause,
                                        Probability probability);

struct TippingPrior {
    /// The rival's prior odds against all others together at which it ties; to_probability() may round to 0
    /// or 1.
    LogOdds prior;
    /// What the rival's prior odds to the leader must be multiplied by: the posterior odds of leader to rival
    /// as they stand.
    LogWeight odds_factor;
};
/// The rival's prior at which its posterior equals the leader's, every other cause, the leader included,
/// keeping its proportion: logit = ln l_leader - ln l_rival + ln (prior of the leader among all but the
/// rival).
/// @param leader, rival  two different causes, each in [0, K); the leader need not lead
[[nodiscard]] TippingPrior tipping_prior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                         const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                                         CauseIndex leader, CauseIndex rival);

/// The prior odds of `cause` against all others together at which its posterior is `target`:
/// logit target - ln l_cause + ln (mean likelihood of the others by their prior).
/// @param target  in (0, 1)
[[nodiscard]] LogOdds prior_for_posterior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                          const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                                          CauseIndex cause, Probability target);

/// Posteriors as the prior probability of `cause` takes each value of a grid.
/// @param priors  [1]; shape (G), G >= 0; each in (0, 1)
/// @returns       probabilities [1]; shape (K, G); columns sum to 1 within a few units in the last place
[[nodiscard]] Eigen::ArrayXXd prior_sweep(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                          const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                                          CauseIndex cause, const Eigen::Ref<const Eigen::ArrayXd>& priors);

/// Slopes of all posteriors by all prior probabilities: entry (k, j) is dP_k / d prior_j,
///     P_j (1 - P_j) / (prior_j (1 - prior_j)) for k = j,   -P_j P_k / (prior_j (1 - prior_j)) otherwise.
/// Not the slope by a prior weight with the others fixed, which is P_j (1 - P_j) / w_j.
/// @returns  [1]; shape (K, K); columns sum to 0 but for rounding
[[nodiscard]] Eigen::ArrayXXd prior_derivative(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                               const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood);

}  // namespace steelyard::engine
