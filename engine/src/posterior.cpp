// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/posterior.hpp"

#include "exact_scores.hpp"
#include "guards.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {

Eigen::ArrayXd log_scores(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                          const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                          const Eigen::Ref<const Eigen::ArrayXd>& weight) {
    return exact_scores("log_scores", log_prior, loglik, weight).below_leader();
}

Eigen::ArrayXd posterior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                         const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                         const Eigen::Ref<const Eigen::ArrayXd>& weight) {
    return softmax(exact_scores("posterior", log_prior, loglik, weight).below_leader());
}

double log_posterior_odds(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                          const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                          const Eigen::Ref<const Eigen::ArrayXd>& weight, CauseIndex a, CauseIndex b) {
    const ExactScores scores = exact_scores("log_posterior_odds", log_prior, loglik, weight);
    check_index("log_posterior_odds", "a", a.value, log_prior.size());
    check_index("log_posterior_odds", "b", b.value, log_prior.size());
    return scores.score[static_cast<std::size_t>(a.value)].minus(
        scores.score[static_cast<std::size_t>(b.value)]);
}

double log_evidence(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                    const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                    const Eigen::Ref<const Eigen::ArrayXd>& weight) {
    const ExactScores scores = exact_scores("log_evidence", log_prior, loglik, weight);
    if (loglik.rows() == 0) {
        return 0.0;
    }
    // The leader's score is taken relative to the largest prior weight, so that a shared constant cancels
    // exactly.
    const double largest_prior = log_prior.maxCoeff();
    const double leader = scores.score[scores.leader].minus(ExactSum(largest_prior));
    return leader + (log_sum_exp(scores.below_leader()) - log_sum_exp(log_prior - largest_prior));
}

}  // namespace steelyard::engine
