// SPDX-License-Identifier: Apache-2.0
#pragma once
// Which of several independent sources the spread of a result comes from: first-order and total indices
// (Sobol'), estimated from f at two sets of points A and B and at mixtures of them (Saltelli et al., Comput
// Phys Commun 2010;181:259, estimators b and f, the latter Jansen's; citation seen). A source may be a block
// of columns: all cells of one row move together, since they are not independent of each other.
// docs/method.md, "Shares of the variance".

#include <Eigen/Core>
#include <vector>

namespace steelyard::engine {

/// Indices of S sources.
struct VarianceShares {
    /// Expected share of the variance that goes when the source alone becomes known [1]; shape (S). An
    /// estimate of a small share may be below 0.
    Eigen::ArrayXd first;
    /// Expected share that stays when all but the source become known [1]; shape (S); >= 0.
    Eigen::ArrayXd total;
    /// Variance of f at A and B together, divided by their number [f squared]; 0 when f does not vary.
    double variance = 0.0;
    /// False when f differs by no more than rounding (8 units in the last place of its largest value): then
    /// there is nothing to share out and every index is 0.
    bool varies = false;
};

/// first_i = mean(f(B) (f(AB_i) - f(A))) / variance, with the mean of f at A and B taken from f first, since
/// otherwise a large mean drowns the sum; total_i = mean((f(A) - f(AB_i))^2) / (2 variance).
/// @param f_a   f at the points A; shape (n), n >= 1; finite
/// @param f_b   f at the points B; shape (n); finite
/// @param f_ab  f at A with source i taken from B; shape (n, S), S >= 0; finite
/// @throws DomainError   O(n S)
[[nodiscard]] VarianceShares variance_shares(const Eigen::Ref<const Eigen::ArrayXd>& f_a,
                                             const Eigen::Ref<const Eigen::ArrayXd>& f_b,
                                             const Eigen::Ref<const Eigen::ArrayXXd>& f_ab);

/// Means over independent replicates with their standard errors: sd / sqrt(R), sd with R - 1.
struct ReplicatedShares {
    Eigen::ArrayXd first, first_error;  ///< [1]; shape (S)
    Eigen::ArrayXd total, total_error;  ///< [1]; shape (S)
    double variance = 0.0;              ///< mean of the replicates' variances
    bool varies = false;                ///< false when f varied in no replicate
};

/// Each replicate must come from points of its own randomisation, as sobol_points() gives with its own shift.
/// A replicate in which f did not vary counts with indices 0.
/// @param replicates  R >= 2, all of the same S   @throws DomainError
[[nodiscard]] ReplicatedShares replicated_shares(const std::vector<VarianceShares>& replicates);

}  // namespace steelyard::engine
