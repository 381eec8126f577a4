// SPDX-License-Identifier: Apache-2.0
#pragma once
// What a finding not yet made can be expected to tell: entropy (Shannon 1948) and expected information
// (Lindley 1956; both from memory), for one finding, for two, and for two steps where the second depends on
// the first. docs/method.md, "Information".
//
// `now` is the distribution over causes given all that is known so far, not the prior. Rows have shape (B,
// K), bands by causes: P(band | cause), columns summing to 1. Probabilities given may miss the sum 1 by 1e-9.
// 0 ln 0 = 0.
//
// Information is a difference of entropies. Round-off that would make it negative is clipped to 0. It is
// below 1e-13 bits (tested with up to 49 outcomes and 8 causes) when the columns sum to 1 within 1e-15;
// columns that miss the sum 1 by more add about that miss.

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/index.hpp"

namespace steelyard::engine {

/// Results this near the best [bits] tie with it: the first listed is taken.
inline constexpr double information_tie = 1e-12;

/// Entropy, -sum p log2 p.
/// @param probability  shape (K), K >= 1; >= 0, sums to 1 within 1e-9   @returns  [bits], in [0, log2 K] up
/// to round-off   @throws DomainError
[[nodiscard]] double entropy_bits(const Eigen::Ref<const Eigen::ArrayXd>& probability);

/// Divergence of q from p (Kullback and Leibler 1951, from memory), sum p log2(p / q): the information in
/// moving from q to p.
/// @param p, q  shape (K), K >= 1; each >= 0, sums to 1 within 1e-9
/// @returns     [bits], >= 0; infinite where q excludes what p allows   @throws DomainError
[[nodiscard]] double divergence_bits(const Eigen::Ref<const Eigen::ArrayXd>& p,
                                     const Eigen::Ref<const Eigen::ArrayXd>& q);

struct ExpectedInformation {
    double bits = 0.0;                ///< H(now) - sum_b P(b) H(after b); >= 0
    Eigen::ArrayXd band_probability;  ///< P(b) = sum_k now_k rows(b, k); shape (B)
    Eigen::ArrayXXd after;  ///< posterior after each band; shape (K, B); `now` for a band with P(b) = 0
};
/// Expected information of one finding that is independent of those known, given the cause.
/// @param now   shape (K), K >= 1; >= 0, sums to 1 within 1e-9   @param rows  shape (B, K), B >= 1; in [0, 1]
/// @throws DomainError
[[nodiscard]] ExpectedInformation expected_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                                       const Eigen::Ref<const Eigen::ArrayXXd>& rows);

/// The chance that the leader changes: the sum of P(b) over bands after which another cause is ahead. A cause
/// ahead by less than 1e-12 of the leader's probability ties and is not ahead.
/// @param band_probability  shape (B), B >= 1; >= 0, sums to 1 within 1e-9
/// @param after             posteriors; shape (K, B); columns sum to 1 within 1e-9
/// @param leader            in [0, K)
/// @returns                 in [0, 1]   @throws DomainError
[[nodiscard]] double leader_change_chance(const Eigen::Ref<const Eigen::ArrayXd>& band_probability,
                                          const Eigen::Ref<const Eigen::ArrayXXd>& after, CauseIndex leader);

struct ReweightedInformation {
    double bits = 0.0;                ///< max(0, H(now) - sum_b P(b) H(after b))
    double leader_changes = 0.0;      ///< leader_change_chance()
    Eigen::ArrayXd band_probability;  ///< shape (B)
};
/// Expected information when adding the finding weighs the known evidence anew (dependent groups), so that
/// the posteriors come from elsewhere. Such posteriors need not average to `now`: the entropy may then be
/// expected to rise, which counts as no information.
/// @param after   posterior after each band; shape (K, B); columns sum to 1 within 1e-9
/// @param leader  the cause that leads now, in [0, K)   Others as expected_information().
/// @throws DomainError
[[nodiscard]] ReweightedInformation reweighted_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                                           const Eigen::Ref<const Eigen::ArrayXXd>& rows,
                                                           const Eigen::Ref<const Eigen::ArrayXXd>& after,
                                                           CauseIndex leader);

/// Expected information of two findings made together, independent given the cause, from their joint
/// outcomes: H(F, G) - sum_k now_k (H(F | k) + H(G | k)). At least that of either, at most the sum of both.
/// @param first   shape (B1, K)   @param second  shape (B2, K)   Others as expected_information().
/// @returns       [bits], >= 0   @throws DomainError. Cost O(B1 B2 K), with B1 B2 logarithms.
[[nodiscard]] double pair_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                      const Eigen::Ref<const Eigen::ArrayXXd>& first,
                                      const Eigen::Ref<const Eigen::ArrayXXd>& second);

/// The expected entropy that two findings leave, told by the bands of one and of the other.
struct PairEntropy {
    Eigen::ArrayXd by_first;   ///< sum_c P(b, c) H(after b and c) [bits]; shape (B1)
    Eigen::ArrayXd by_second;  ///< sum_b P(b, c) H(after b and c) [bits]; shape (B2)
};
/// Entropy left after two findings whose groups are weighed anew, by band: what a choice of the second
/// finding after the first is made from. Parameters and errors as reweighted_pair_information().
[[nodiscard]] PairEntropy reweighted_pair_entropy(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                                  const Eigen::Ref<const Eigen::ArrayXd>& log_base,
                                                  const Eigen::Ref<const Eigen::ArrayXXd>& first_loglik,
                                                  const Eigen::Ref<const Eigen::ArrayXXd>& second_loglik,
                                                  const Eigen::Ref<const Eigen::ArrayXXd>& first_rows,
                                                  const Eigen::Ref<const Eigen::ArrayXXd>& second_rows);

/// What pair_information() is to expected_information(), for groups that are weighed anew:
/// max(0, H(now) - sum P(b, c) H(after b and c)), P(b, c) = sum_k now_k rows1(b, k) rows2(c, k), after b and
/// c proportional to exp(log_base + loglik1(b) + loglik2(c)).
/// @param log_base                      log-scores of all else that is known, weighed as when both are added
///                                      [nats], up to a constant; shape (K); finite
/// @param first_loglik, second_loglik   weighed ln P(band | cause) [nats]; shapes (B1, K), (B2, K); finite
/// @param first_rows, second_rows       P(band | cause) for the prediction; the same shapes
/// @throws DomainError. Cost O(B1 B2 K), with B1 B2 logarithms.
[[nodiscard]] double reweighted_pair_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                                 const Eigen::Ref<const Eigen::ArrayXd>& log_base,
                                                 const Eigen::Ref<const Eigen::ArrayXXd>& first_loglik,
                                                 const Eigen::Ref<const Eigen::ArrayXXd>& second_loglik,
                                                 const Eigen::Ref<const Eigen::ArrayXXd>& first_rows,
                                                 const Eigen::Ref<const Eigen::ArrayXXd>& second_rows);

/// The first entry within 1e-12 of the largest. @param bits  shape (F), F >= 1; finite   @throws DomainError
[[nodiscard]] FindingIndex first_best(const Eigen::Ref<const Eigen::ArrayXd>& bits);

struct FindingPair {
    FindingIndex first, second;  ///< first < second
    double bits = 0.0;           ///< pair_information()
};
/// The two findings to make together, chosen before either is seen; ties go to the first listed, (0, 1)
/// before (0, 2) before (1, 2).
/// @param findings  rows of each, shape (B_f, K); at least 2   @throws DomainError. Cost O(F^2 B^2 K).
[[nodiscard]] FindingPair best_pair(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                    const std::vector<Eigen::ArrayXXd>& findings);

struct TwoStepPlan {
    double bits = 0.0;  ///< of both steps together
    std::vector<std::optional<FindingIndex>>
        second;  ///< the best second after each band; none where P(b) = 0
};
/// Makes `first`, then for each of its bands the other finding that is expected to tell most; ties go to the
/// first listed. At least as good as `first` with any one fixed partner.
/// @param findings  rows of each, shape (B_f, K); at least 2   @param first  in [0, F)   @throws DomainError
[[nodiscard]] TwoStepPlan two_step_plan(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                        const std::vector<Eigen::ArrayXXd>& findings, FindingIndex first);

}  // namespace steelyard::engine
