// SPDX-License-Identifier: Apache-2.0
#pragma once
// The correlation rho of each group of findings, learnt from patients whose final cause is known: the rho
// that makes the final causes likeliest when m observed findings of a group weigh 1 / (1 + (m - 1) rho) each
// (Kish's design effect, from memory). docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>
#include <vector>

namespace steelyard::engine {

/// What one group adds to each pattern.
struct GroupEvidence {
    Eigen::ArrayXXd loglik;  ///< shape (G, K) [nats]: sum over its observed findings of ln P(band | cause),
                             ///< not yet weighed; finite, <= 0; 0 when none was observed
    Eigen::ArrayXd observed;  ///< shape (G): how many were observed, m; whole, >= 0
};

/// G patterns, K causes.
struct GroupedEvidence {
    Eigen::ArrayXd log_prior;           ///< shape (K) [nats], up to a constant; finite
    Eigen::ArrayXXd ungrouped;          ///< shape (G, K) [nats]: findings in no group; finite, <= 0
    std::vector<GroupEvidence> groups;  ///< at least one
    Eigen::ArrayXXd count;              ///< shape (G, K): patients by final cause; finite, >= 0
};

struct GroupCorrelation {
    double rho = 0.0;  ///< [1], in [0, 1]
    double low = 0.0,
           high = 1.0;  ///< rho whose best log likelihood, the other groups fitted anew, is at most
                        ///< 1.92 below the highest (95 %); 0 or 1 where the drop is not reached
    bool at_lower_border = false;  ///< the best rho is 0: the findings look independent, or less than that
    bool at_upper_border = false;  ///< the best rho is 1: m findings weigh no more than one
    bool low_open = false;         ///< the drop is not reached on the way to 0
    bool high_open = false;        ///< nor on the way to 1
};

struct GroupCorrelations {
    /// One per group; empty when no patient has two or more of its findings, or when they say the same of
    /// every cause, so that no rho is better than another.
    std::vector<std::optional<GroupCorrelation>> group;
    double loglik = 0.0;              ///< of the final causes at the fitted rho [nats]
    double loglik_independent = 0.0;  ///< at rho = 0 everywhere: each finding counted in full
};

/// All groups together, by Fisher scoring within [0, 1] from the best point of a coarse grid. The likelihood
/// is of the final cause given the pattern. Fitted on the patients that made the tables it flatters.
/// @throws DomainError  shapes, ranges, no patients
[[nodiscard]] GroupCorrelations fit_group_correlations(const GroupedEvidence& evidence);

}  // namespace steelyard::engine
