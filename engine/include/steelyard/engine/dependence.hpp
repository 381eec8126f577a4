// SPDX-License-Identifier: Apache-2.0
#pragma once
// Findings that are not independent given the cause. Multiplying them counts what they share several times
// and drives posteriors towards 0 and 1 (Russek, Kronmal and Fisher 1983). Here: joint tables of two
// findings, a measure of dependence within a cause, one exponent for the whole evidence (tempering), weights
// of evidence re-weighted by logistic regression (Spiegelhalter and Knill-Jones 1984), and Cox's calibration
// slope. docs/method.md, "Dependence".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/logistic.hpp"

namespace steelyard::engine {

/// Joint band probabilities of two findings under one cause: (count + start) / (total + start * cells).
/// @param counts  patients; shape (B1, B2), each >= 2; finite, >= 0   @param start  per joint cell; > 0
/// @returns       shape (B1, B2); each in (0, 1); sums to 1   @throws DomainError
[[nodiscard]] Eigen::ArrayXXd joint_probability(const Eigen::Ref<const Eigen::ArrayXXd>& counts,
                                                double start = 0.5);

/// Margin of the first finding of a joint table: row sums. This, not an unrelated single table, is what is
/// read when the other finding is missing. @param joint  shape (B1, B2); >= 0; sums to 1 within 1e-9  @throws
/// DomainError
[[nodiscard]] Eigen::ArrayXd first_margin(const Eigen::Ref<const Eigen::ArrayXXd>& joint);
/// Margin of the second finding: column sums.
[[nodiscard]] Eigen::ArrayXd second_margin(const Eigen::Ref<const Eigen::ArrayXXd>& joint);

/// ln P(what was seen of the pair | cause) for each cause: the cell with both findings, a margin with one, 0
/// with none. It is one line of evidence for posterior().
/// @param joints  joint probabilities, one table per cause, all of shape (B1, B2); > 0
/// @param first   0-based band of the first finding, empty when missing   @param second  of the second
/// @returns       shape (K) [nats]; finite, <= 0   @throws DomainError
[[nodiscard]] Eigen::ArrayXd joint_loglik(const std::vector<Eigen::ArrayXXd>& joints,
                                          std::optional<Eigen::Index> first,
                                          std::optional<Eigen::Index> second);

/// Mutual information of the two findings within one cause [nats]: sum of p ln(p / (row sum * column sum));
/// an empty cell adds 0. It is 0 when they are independent. Dependence over all patients together proves
/// nothing: good findings agree because they share the cause.
/// @param joint  shape (B1, B2); >= 0; sums to 1 within 1e-9   @returns  >= 0   @throws DomainError
[[nodiscard]] double mutual_information(const Eigen::Ref<const Eigen::ArrayXXd>& joint);

/// Naive weights of evidence re-weighted against the outcome.
struct ReweightedFindings {
    LogisticFit fit;
    /// Findings whose factor came out negative, 0-based: their evidence would be read against its own table.
    /// Show them; do not use the factors as they stand.
    std::vector<Eigen::Index> reversed;
};

/// Factors b_j for the naive weights w_j = ln(p_1j / p_0j) of each finding, two causes. All factors 1 means
/// independent.
/// @param weight  naive weights [nats]; shape (N, J), J >= 1   Other parameters and errors as fit_logistic().
[[nodiscard]] ReweightedFindings reweight_findings(const Eigen::Ref<const Eigen::ArrayXXd>& weight,
                                                   const Eigen::Ref<const Eigen::ArrayXi>& y,
                                                   const Eigen::Ref<const Eigen::ArrayXd>& count);

}  // namespace steelyard::engine
