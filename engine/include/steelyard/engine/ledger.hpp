// SPDX-License-Identifier: Apache-2.0
#pragma once
// The weights of evidence that add up from prior to posterior, finding by finding. For any pair of causes the
// lines are additive; "one cause against all others" is not, and is not offered. docs/method.md, "Ledger".

#include <Eigen/Core>
#include <vector>

namespace steelyard::engine {

struct Ledger {
    Eigen::ArrayXd log_prior;      ///< shape (K) [nats], normalised so that exp sums to 1
    Eigen::ArrayXXd contribution;  ///< shape (F, K) [nats]: weight * log-likelihood
    Eigen::ArrayXd log_posterior;  ///< shape (K) [nats], normalised so that exp sums to 1

    /// The lines for cause a against cause b [nats]: prior, then each finding in order. The last digit adds
    /// up: `total` is by definition the sum of the lines in order. log_posterior_odds() is the same number
    /// rounded once.
    struct Pair {
        double prior = 0.0;
        Eigen::ArrayXd lines;
        double total = 0.0;
    };
    /// @param a, b  causes, each in [0, K)   @throws DomainError
    Pair pair(Eigen::Index a, Eigen::Index b) const;
};

/// Parameters and errors as posterior().
[[nodiscard]] Ledger ledger(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                            const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                            const Eigen::Ref<const Eigen::ArrayXd>& weight);

/// Values rounded to `digits` decimals such that the rounded lines add up exactly to the rounded running
/// total: line i is round(total up to i) - round(total up to i - 1), so each is within one unit of its own
/// value's last place. The adding is exact in decimals as printed; totals are rounded as printed numbers are
/// (nearest, ties to even).
/// @param lines   finite; every running total times 10^digits within 2^52   @param digits  in [0, 15]
/// @throws DomainError
[[nodiscard]] std::vector<double> rounded_to_add_up(const std::vector<double>& lines, int digits);

/// The weight of each of m findings observed in a group of intra-class correlation rho: 1 / (1 + (m - 1)
/// rho), Kish's design effect. @param m >= 1  @param rho in [0, 1]  @throws DomainError
[[nodiscard]] double dependence_weight(int m, double rho);

}  // namespace steelyard::engine
