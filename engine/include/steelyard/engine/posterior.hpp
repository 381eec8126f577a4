// SPDX-License-Identifier: Apache-2.0
#pragma once
// From prior odds and the log-likelihoods of what was seen to posterior probabilities. Everything is in log
// space; it is left once, at the end. docs/method.md, "Posterior".
//
// Sums are carried with twice the digits of a double, and differences between causes are taken before
// rounding: with 40 findings near ln P = -700 each score is near -28,000, and two rounded scores would differ
// by 1e-11 too much or too little.

#include <Eigen/Core>

#include "steelyard/engine/index.hpp"

namespace steelyard::engine {

/// Log posterior weights of K causes below the leader's:
/// score_k = log_prior_k + sum over findings of weight_f * loglik(f, k), minus the largest score.
///
/// @param log_prior  log prior weights [nats], up to one shared constant; shape (K), K >= 2; finite.
/// @param loglik     ln P(band seen | cause) [nats]; shape (F, K), F >= 0; finite, <= 0.
/// @param weight     dependence factor of each finding [1]; shape (F); each in (0, 1].
/// @returns          shape (K) [nats]; finite, <= 0, the leader 0. Each is the exact difference to the leader
/// rounded
///                   once (within 2 ulp), so the order of findings does not matter beyond that.
/// @throws DomainError  shapes differ, an entry is NaN or out of range, or a score overflows. Cost O(F K).
[[nodiscard]] Eigen::ArrayXd log_scores(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                        const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                                        const Eigen::Ref<const Eigen::ArrayXd>& weight);

/// Posterior probabilities: the softmax of log_scores(). Same parameters and errors.
/// @returns  probabilities [1]; shape (K); each in [0, 1]; |sum - 1| <= K * 2^-52. The odds of any two that
/// did not
///           underflow are right to 1e-12 of their value.
[[nodiscard]] Eigen::ArrayXd posterior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                       const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                                       const Eigen::Ref<const Eigen::ArrayXd>& weight);

/// ln of the posterior odds of cause a to cause b [nats], rounded once, for any pair: also for two causes so
/// far behind the leader that both posteriors underflow to 0. Other parameters and errors as log_scores().
/// @param a, b  causes, each in [0, K)
[[nodiscard]] double log_posterior_odds(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                        const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                                        const Eigen::Ref<const Eigen::ArrayXd>& weight, CauseIndex a,
                                        CauseIndex b);

/// ln of the probability of everything seen, averaged over the causes by their prior:
/// ln sum_k prior_k exp(sum_f weight_f loglik(f, k)) with the prior normalised to sum 1. Same parameters and
/// errors.
/// @returns  [nats]; finite, <= 0 up to rounding; 0 when nothing was observed
[[nodiscard]] double log_evidence(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                  const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                                  const Eigen::Ref<const Eigen::ArrayXd>& weight);

}  // namespace steelyard::engine
