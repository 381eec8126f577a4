// SPDX-License-Identifier: Apache-2.0
#pragma once
// Findings that are not certain. "80 % sure it is positive" has two readings: a likelihood of the report
// (virtual evidence, Pearl 1988) or the new probability of the band, all things considered (Jeffrey 1965).
// They can differ by a factor of four; a caller must know which is meant. Also: a measured value near a cut.
// docs/method.md, "Soft evidence".
//
// A table has shape (B, K), bands by causes; its columns are P(band | cause) and sum to 1.

#include <Eigen/Core>

namespace steelyard::engine {

/// One line of evidence for posterior() from virtual evidence: ln sum_b lambda_b P(b | cause), lambda scaled
/// so that its largest entry is 1. Only the proportions of lambda matter; equal ones change nothing.
/// @param table   shape (B, K), B >= 2, K >= 1; each in [0, 1]; columns sum to 1 within 1e-9
/// @param lambda  proportional to P(report | band); shape (B); finite, >= 0, not all 0
/// @returns       shape (K) [nats]; <= 0; -infinity where a cause allows no band of the report
/// @throws DomainError
[[nodiscard]] Eigen::ArrayXd virtual_loglik(const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                            const Eigen::Ref<const Eigen::ArrayXd>& lambda);

/// Posterior after virtual evidence: P_k proportional to prior_k sum_b lambda_b P(b | k). Commutes with other
/// evidence.
/// @param prior  weights on any scale [1]; shape (K); finite, >= 0, not all 0   Others as virtual_loglik().
/// @returns      probabilities; shape (K); sum 1
/// @throws DomainError  also when no cause with a prior allows the report (`lambda`)
[[nodiscard]] Eigen::ArrayXd virtual_evidence(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                              const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                              const Eigen::Ref<const Eigen::ArrayXd>& lambda);

/// P(band) before it is seen: sum_k prior_k P(b | k). @returns  shape (B); sums to 1  @throws DomainError
[[nodiscard]] Eigen::ArrayXd band_marginal(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                           const Eigen::Ref<const Eigen::ArrayXXd>& table);

/// Posterior by Jeffrey's rule: sum_b q_b P(k | b). Does not commute: the last entry has the last word. q
/// equal to the current marginal changes nothing.
/// @param q  new band probabilities; shape (B); >= 0; sum 1 within 1e-9; 0 where the marginal is 0
/// @returns  probabilities; shape (K); sum 1
/// @throws DomainError  also when a band that the prior holds impossible is given a probability (`q`, its
/// position)
[[nodiscard]] Eigen::ArrayXd jeffrey_update(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                            const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                            const Eigen::Ref<const Eigen::ArrayXd>& q);

/// The virtual evidence that does what jeffrey_update() does: lambda_b = q_b / P(b) (Chan and Darwiche 2003).
/// Parameters and errors as jeffrey_update(). @returns  shape (B); 0 where q is 0
[[nodiscard]] Eigen::ArrayXd equivalent_virtual_evidence(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                                         const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                                         const Eigen::Ref<const Eigen::ArrayXd>& q);

/// The band a value falls in when it is taken as exact: the number of edges <= value, so an edge belongs to
/// the band above it. @param edges  shape (B - 1); finite, increasing  @throws DomainError
[[nodiscard]] Eigen::Index hard_band(double value, const Eigen::Ref<const Eigen::ArrayXd>& edges);

/// Mass of each band about a reading with normal error: Phi((upper - reading) / sd) - Phi((lower - reading) /
/// sd), each difference taken in the tail where it is small. It is the posterior of the true band when the
/// true value could be anything, so it suits jeffrey_update(), not virtual_evidence(): as a likelihood it
/// would favour wide bands.
/// @param reading  finite   @param sd  error by which this method exceeds the study's [unit of reading];
/// finite, > 0.
///                 Tables learned from measured values hold their own error already.
/// @param edges    shape (B - 1), B >= 2; finite, increasing
/// @returns        shape (B); each in [0, 1]; sums to 1   @throws DomainError
[[nodiscard]] Eigen::ArrayXd band_mass(double reading, double sd,
                                       const Eigen::Ref<const Eigen::ArrayXd>& edges);

/// Virtual evidence of a reading: the mean density of the reading over each band, (mass in the band) / (its
/// width), for a true value spread evenly inside the band. The outer bands end at `lowest` and `highest`.
/// @param lowest   below the first edge; finite   @param highest  above the last edge; finite   Others as
/// band_mass().
/// @returns        shape (B) [1 / unit]; >= 0; not all 0   @throws DomainError  also when every band's
/// density is 0
[[nodiscard]] Eigen::ArrayXd band_density(double reading, double sd,
                                          const Eigen::Ref<const Eigen::ArrayXd>& edges, double lowest,
                                          double highest);

}  // namespace steelyard::engine
