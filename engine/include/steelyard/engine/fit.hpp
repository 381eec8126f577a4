// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether the findings hang together, and whether any cause on the list predicts what was seen: a posterior
// is a share among the causes listed, and is high for the least bad of them when none fits. docs/method.md,
// "Fit".
//
// All of it is about findings as they are, not about the weights of dependent groups: ln P(band | cause) goes
// in unweighed, and findings count as independent given the cause.
//
// A pattern is one band of each finding; its tables have shape (B_f, K), P(band | cause), columns summing to
// 1 within 1e-9. Probabilities within 1e-9 of each other's value tie: an outcome that unlikely is "as
// unusual".

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <optional>
#include <vector>

#include "steelyard/engine/index.hpp"

namespace steelyard::engine {

struct Conflict {
    /// log2 [prod_f P(x_f) / P(x_1 .. x_F)]; above 0 when the findings go together worse than unrelated ones;
    /// 0 with fewer than two findings
    double bits = 0.0;
    Eigen::ArrayXd gain_bits;        ///< log2 [P(k | all) / P(k)]; shape (K); -infinity for a cause ruled out
    std::vector<bool> explained_by;  ///< shape (K): gain_bits >= bits - 1e-12, the cause would account for it
};
/// Conflict between findings (Jensen, Bayesian Networks and Decision Graphs; from memory), in logs
/// throughout.
/// @param prior   P(cause) before these findings; shape (K), K >= 1; >= 0, sums to 1 within 1e-9
/// @param loglik  ln P(band seen | cause) [nats]; shape (F, K), F >= 0; <= 0, -infinity allowed
/// @throws DomainError  also when no cause with a prior allows all that was seen (`loglik`)
[[nodiscard]] Conflict conflict(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                const Eigen::Ref<const Eigen::ArrayXXd>& loglik);

/// A uniform number in (0, 1) for a draw and a finding, the same whenever it is asked for (a counter-based
/// generator).
using UniformOfDraw = std::function<double(std::uint64_t draw, std::uint32_t finding)>;

struct SurpriseLimits {
    /// of either half of the findings; beyond it patterns are drawn
    std::uint64_t most_outcomes = 1U << 15U;
    std::uint64_t draws = 65536;  ///< of patterns from each cause; in [1, 1e12]
};

struct Surprise {
    Eigen::ArrayXd probability;  ///< shape (K); in (0, 1]; 0 for a cause under which the pattern cannot be
    Eigen::ArrayXd error;        ///< Monte Carlo standard error; shape (K); 0 when exact
    bool exact = true;
};
/// For each cause, the probability under it of a pattern at least as unusual as the one seen: of all outcomes
/// whose probability is at most that of the pattern, ties included (Box 1980, applied per cause; from
/// memory).
///
/// Exact by meeting in the middle: the findings are split into two halves of about equally many outcomes,
/// each half's outcomes are listed in order of probability, and one is walked up while the other is walked
/// down. When a half has more outcomes than the limit, patterns are drawn from each cause instead, and the
/// result is (1 + as unusual) / (1 + draws), which is never 0 (Davison and Hinkley 1997, from memory).
/// @param bands     tables; F >= 1   @param seen  the band of each finding; F
/// @param uniform   called only beyond the limit; the same numbers serve all causes
/// @returns         exact values above 1e-290 are right to 1e-12 of their value
/// @throws DomainError  shapes, ranges; K differs between tables; the limit is passed and `uniform` is empty
///                      or leaves (0, 1). Cost O(K sqrt(outcomes) log B), or O(draws F (K B + one uniform)).
[[nodiscard]] Surprise surprise(const std::vector<Eigen::ArrayXXd>& bands, const std::vector<BandIndex>& seen,
                                const UniformOfDraw& uniform = {}, const SurpriseLimits& limits = {});

struct PredictiveCheck {
    double probability = 0.0;  ///< of the pattern, all causes together
    /// of any pattern no more probable than this one (Box 1980); none beyond the limit
    std::optional<double> p_value;
    /// Weaver's index (1948): the mean probability of a pattern over that of this one; well above 1 is
    /// surprising, infinite for a pattern that cannot be
    double surprise_index = 0.0;
};
/// How unusual the pattern is before the cause is known, each outcome weighed over the causes. The p value is
/// by full enumeration; the index by sum_kl prior_k prior_l prod_f sum_b P(b | k) P(b | l), at any size.
/// @param prior  shape (K), K >= 1; >= 0, sums to 1 within 1e-9   @param bands  tables; F >= 1
/// @param seen   the band of each finding; F
/// @param most_outcomes  the most to enumerate   @throws DomainError
[[nodiscard]] PredictiveCheck predictive_check(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                               const std::vector<Eigen::ArrayXXd>& bands,
                                               const std::vector<BandIndex>& seen,
                                               std::uint64_t most_outcomes = 1U << 20U);

}  // namespace steelyard::engine
