// SPDX-License-Identifier: Apache-2.0
#pragma once
// How the posterior answers to one figure of the model: a prior, or one cell of one cause's row. The figure
// takes the value theta; the rest of its row (or the other priors) keep their proportions. The cause that
// owns the figure then has posterior log odds
//     start + rise ln theta + fall ln(1 - theta),
// and the others share what it leaves in fixed proportions. For a figure of weight 1 each posterior is
// (a theta + b) / (c theta + d) (Coupe and van der Gaag, Ann Math Artif Intell 2002;36:323, from memory).
// docs/method.md, "One figure at a time".
//
// log_prior and log_likelihood [nats], up to a shared constant each; shape (K), K >= 2; finite. The figure's
// own row is part of log_likelihood as it stands.

#include <Eigen/Core>
#include <cstddef>
#include <optional>
#include <vector>

#include "steelyard/engine/index.hpp"
#include "steelyard/engine/probability.hpp"

namespace steelyard::engine {

struct SensitivityCurve {
    CauseIndex owner;          ///< the cause whose figure it is
    double current = 0.0;      ///< theta as it stands [1], in (0, 1)
    double start = 0.0;        ///< [nats]
    double rise = 0.0;         ///< [1]: 1 for a prior, the finding's weight for the seen cell, else 0
    double fall = 0.0;         ///< [1]: -1 for a prior, the finding's weight for a cell not seen, else 0
    Eigen::ArrayXd log_share;  ///< ln of each other cause's part of what the owner leaves; -inf at the owner

    /// @param theta  [1], in [0, 1]   @returns  probabilities [1]; shape (K); sum 1   @throws DomainError
    [[nodiscard]] Eigen::ArrayXd posterior(double theta) const;

    /// dP_k / d theta. @param theta  [1], in (0, 1)   @returns  [1]; shape (K); sums to 0   @throws
    /// DomainError
    [[nodiscard]] Eigen::ArrayXd derivative(double theta) const;

    /// The theta in [0, 1] at which causes a and b have the same posterior; none when no theta makes them
    /// tie. Two causes that do not own the figure keep their odds, so theta decides nothing between them:
    /// none. Within rounding of 0 and 1 the answer may be 0 or 1.
    /// @param a, b  two different causes, each in [0, K)   @throws DomainError
    [[nodiscard]] std::optional<double> tie(CauseIndex a, CauseIndex b) const;
};

/// theta = the prior probability of `cause`. @throws DomainError  a shape or an entry is not as stated above;
/// also when the prior rounds to 0 or 1
[[nodiscard]] SensitivityCurve prior_curve(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                           const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                                           CauseIndex cause);

/// theta = P(the band that was seen | cause) of one finding.
/// @param cell    that probability as it stands [1], in (0, 1)
/// @param weight  dependence factor of the finding [1], in (0, 1]
/// @throws DomainError
[[nodiscard]] SensitivityCurve seen_cell_curve(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                               const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                                               CauseIndex cause, double cell, double weight = 1.0);

/// theta = P(another band of the same row | cause): raising it lowers the seen one. Parameters and errors as
/// seen_cell_curve().
[[nodiscard]] SensitivityCurve other_cell_curve(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                                const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                                                CauseIndex cause, double cell, double weight = 1.0);

/// The posterior of one cause at the low and the high plausible value of a figure.
struct Swing {
    double at_low = 0.0;   ///< [1]
    double at_high = 0.0;  ///< [1]; may be below at_low
    [[nodiscard]] double width() const;
};
/// @param low, high  [1]; 0 <= low <= high <= 1   @throws DomainError
[[nodiscard]] Swing swing(const SensitivityCurve& curve, double low, double high, CauseIndex target);

/// Which bar of a tornado diagram comes first: the widest; of equals, the one given first.
/// @returns  places in `bars`; as many as there are bars
[[nodiscard]] std::vector<std::size_t> tornado_order(const std::vector<Swing>& bars);

/// How far belief moved from p to q: the largest minus the smallest ln(q_k / p_k) (Chan and Darwiche, Int J
/// Approx Reason 2005;38:149, abstract seen). No odds of any event, given any evidence, change by more than
/// e to this power. For a binary parameter it is the change of its log odds.
/// @param log_p, log_q  [nats], up to a shared constant each; shape (K), K >= 1; finite
/// @returns  [nats], >= 0   @throws DomainError
[[nodiscard]] double belief_distance(const Eigen::Ref<const Eigen::ArrayXd>& log_p,
                                     const Eigen::Ref<const Eigen::ArrayXd>& log_q);

struct BeliefBounds {
    Probability low, high;
};
/// Where a belief can be after a move of at most `distance`: P e^-+D / (P e^-+D + 1 - P).
/// @param distance  [nats], finite, >= 0   @throws DomainError
[[nodiscard]] BeliefBounds belief_bounds(Probability before, double distance);

/// Kullback-Leibler divergence: sum_k p_k ln(p_k / q_k). Parameters as belief_distance().
/// @returns  [nats], >= 0   @throws DomainError
[[nodiscard]] double relative_entropy(const Eigen::Ref<const Eigen::ArrayXd>& log_p,
                                      const Eigen::Ref<const Eigen::ArrayXd>& log_q);

}  // namespace steelyard::engine
