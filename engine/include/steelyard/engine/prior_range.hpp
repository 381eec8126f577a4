// SPDX-License-Identifier: Apache-2.0
#pragma once
// The exact range of each posterior when the priors may be anywhere in a set. Nothing is drawn: each end is
// attained at a corner of the set, which is returned so that it can be put back. The ends of several causes
// are not attained together, so they do not add up to anything. docs/method.md, "Range of the posterior".
//
// log_likelihood in all of them: weighted sum of all findings per cause [nats], up to a shared constant;
// shape (K), K >= 2; finite. All are O(K^2 log K) at most.

#include <Eigen/Core>

namespace steelyard::engine {

struct PosteriorRange {
    Eigen::ArrayXd low;       ///< least posterior of each cause [1]; shape (K)
    Eigen::ArrayXd high;      ///< greatest [1]; shape (K)
    Eigen::ArrayXXd low_at;   ///< shape (K, K); column k: the prior at which low(k) is attained
    Eigen::ArrayXXd high_at;  ///< shape (K, K); column k: the prior at which high(k) is attained
};

/// Limits of prior probabilities that sum to 1.
struct ProbabilityLimits {
    Eigen::ArrayXd low;   ///< [1]; shape (K)
    Eigen::ArrayXd high;  ///< [1]; shape (K)
};

/// The part of each interval that can be reached: a probability is at least 1 - (the others' upper limits)
/// and at most 1 - (the others' lower limits). A caller should show where this is narrower than what was
/// given.
/// @param low, high  [1]; shape (K), K >= 2; 0 <= low <= high <= 1; sum of low at most 1, sum of high at
///                   least 1, within 1e-9 (limits are typed as decimals)
/// @throws DomainError  `sum of low` or `sum of high` when no prior lies within the limits
[[nodiscard]] ProbabilityLimits tightened(const Eigen::Ref<const Eigen::ArrayXd>& low,
                                          const Eigen::Ref<const Eigen::ArrayXd>& high);

/// Prior probabilities each within limits, summing to 1. The posterior is linear-fractional in them (Charnes
/// and Cooper 1962, from memory), so filling greedily is exact: for the least posterior of cause k its prior
/// is as low as can be and what is left goes to the likeliest others first; for the greatest, the reverse.
/// Parameters and errors as tightened(). Corners sum to 1 within 1e-9; what lies within K 2^-52 of a limit
/// stands on it, since a remainder of rounding must not be given to a cause of limit 0.
[[nodiscard]] PosteriorRange range_of_probabilities(const Eigen::Ref<const Eigen::ArrayXd>& low,
                                                    const Eigen::Ref<const Eigen::ArrayXd>& high,
                                                    const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood);

/// Prior weights each within limits, on any shared scale, free of each other: the one at its lower limit with
/// all others at their upper, and the reverse. Another set than range_of_probabilities(), with other ranges.
/// @param low, high  [1]; shape (K), K >= 2; finite; 0 <= low <= high, high > 0   @throws DomainError
[[nodiscard]] PosteriorRange range_of_weights(const Eigen::Ref<const Eigen::ArrayXd>& low,
                                              const Eigen::Ref<const Eigen::ArrayXd>& high,
                                              const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood);

/// Every prior (1 - epsilon) prior + epsilon q, q any probabilities: epsilon-contamination (Huber 1973;
/// Berger and Berliner, Ann Stat 1986;14:461; both from memory). q is all on the cause itself for the
/// greatest, all on the likeliest other for the least posterior.
/// @param log_prior  log prior weights [nats], up to a shared constant; shape (K), K >= 2; finite
/// @param epsilon    [1], in [0, 1]   @throws DomainError
[[nodiscard]] PosteriorRange range_of_contamination(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                                    double epsilon,
                                                    const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood);

}  // namespace steelyard::engine
