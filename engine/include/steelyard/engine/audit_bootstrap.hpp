// SPDX-License-Identifier: Apache-2.0
#pragma once
// Intervals by resampling for the figures of an audit that have none in closed form. docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/resampling.hpp"

namespace steelyard::engine {

/// A cause and a forecast of it from which one would act.
struct ActionThreshold {
    Eigen::Index cause = 0;
    double threshold = 0.5;  ///< [1]; in [1e-6, 1 - 1e-6]
};

/// Intervals are empty where the figure is not estimable, in the sample or in more than a tenth of its
/// replicates.
struct AuditIntervals {
    std::optional<BootstrapInterval> log_score, brier, log_skill, brier_skill;
    std::optional<BootstrapInterval> top_1, top_2;
    std::vector<std::optional<BootstrapInterval>> area;  ///< one cause against the rest; K entries
    std::optional<BootstrapInterval> hand_till;          ///< over the pairs of the sample
    std::vector<std::optional<BootstrapInterval>> calibration_error;  ///< ECE; K entries
    std::optional<BootstrapInterval> leader_calibration_error;
    /// Cox's; K entries. Each replicate takes one Newton step from the estimate of the whole sample: its
    /// score and information there are sums over patients. Not the replicate's own maximum, but the same to
    /// first order.
    std::vector<std::optional<BootstrapInterval>> intercept, slope;
    std::vector<std::optional<BootstrapInterval>> net_benefit;  ///< one per threshold asked for
};

/// Everything but the areas and absolute values is a function of sums over patients, so that a replicate is
/// one pass over the cells with a patient in them, and one pass in the order of each cause's forecasts for
/// the areas. Memory: about 10 G K numbers, and 2 million per thread. Time: R (cells + 7 G K) and the draws.
/// @param sample      counts whole, their sum below 2^31
/// @param bins        of the calibration errors, in [1, 1000]
/// @param thresholds  for net benefit; may be empty
/// @throws DomainError
[[nodiscard]] AuditIntervals audit_intervals(const AuditSample& sample, const ResamplingOptions& options,
                                             Eigen::Index bins = 10,
                                             const std::vector<ActionThreshold>& thresholds = {});

}  // namespace steelyard::engine
