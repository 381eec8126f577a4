// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether forecasts are higher for patients who have a cause than for those who do not: areas under ROC
// curves, ties counted one half. One cause against the rest with DeLong's variance (DeLong, DeLong and
// Clarke-Pearson, Biometrics 1988;44:837, from memory); pairs and their mean M (Hand and Till, Mach Learn
// 2001;45:171, citation and package tests seen). The direction is fixed: below 1/2 means worse than chance.
// docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {

/// P(forecast of k is higher for a case of k than for another patient) + P(equal) / 2.
struct AreaUnderCurve {
    double value = 0.0;  ///< in [0, 1]
    /// DeLong's. Empty with fewer than two patients on either side, and 0 / 0 is not shown: also empty when
    /// every case is placed alike, as at an area of 1 (the variance would come out as 0, which is no
    /// statement).
    std::optional<double> variance;
    std::optional<IntervalEstimate> interval;  ///< value -/+ z sqrt(variance), cut at 0 and 1
};

/// @param cause  0-based   @param level  in (0, 1)
/// @returns      empty when nobody has the cause, or everybody   @throws DomainError   Cost G ln G.
[[nodiscard]] std::optional<AreaUnderCurve> area_under_curve(const AuditSample& sample, Eigen::Index cause,
                                                             double level = 0.95);

/// A(i|j): P(forecast of i is higher for a case of i than for a case of j) + P(equal) / 2, only the cases of
/// i and j looked at.
struct PairwiseAreas {
    Eigen::ArrayXXd
        area;  ///< shape (K, K): row i, column j; NaN on the diagonal and where i or j has no case
    /// M: mean of [A(i|j) + A(j|i)] / 2 over the pairs of causes that both have cases; every pair weighs the
    /// same. Empty when fewer than two causes have cases.
    std::optional<double> hand_till;
    Eigen::Index pairs = 0;  ///< of how many pairs; below K (K - 1) / 2 when a cause has no case: then M is
                             ///< not comparable with one over all pairs
};

/// @throws DomainError   Cost K G ln G + G K^2 at worst.
[[nodiscard]] PairwiseAreas pairwise_areas(const AuditSample& sample);

}  // namespace steelyard::engine
