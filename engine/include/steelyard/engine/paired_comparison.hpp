// SPDX-License-Identifier: Apache-2.0
#pragma once
// Two forecasts of the same patients, such as from two prior sets: differences are taken patient by patient,
// which is far sharper than setting two audits side by side (Redelmeier, Bloch and Hickam, J Clin Epidemiol
// 1991;44:1141, abstract seen). docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/resampling.hpp"

namespace steelyard::engine {

/// G rows of patients who share both forecasts, K causes. Domains as in AuditSample.
struct PairedSample {
    Eigen::ArrayXXd log_forecast;        ///< of the first; shape (G, K) [nats]
    Eigen::ArrayXXd other_log_forecast;  ///< of the second; shape (G, K)
    Eigen::ArrayXXd count;               ///< patients by final cause; shape (G, K); whole, sum below 2^31
};

/// First minus second, mean over patients.
struct PairedDifference {
    double first = 0.0, second = 0.0;  ///< the two means
    double difference = 0.0;
    /// sd of the patients' differences (n - 1) / sqrt(n); empty for one patient.
    std::optional<double> standard_error;
    /// Student's t of n - 1 degrees of freedom and its two-sided p; empty when the differences do not vary.
    std::optional<double> t, p_two_sided;
    std::optional<BootstrapInterval> interval;  ///< patients resampled with both their forecasts
};

/// Difference of two areas on the same patients.
struct AreaDifference {
    double first = 0.0, second = 0.0, difference = 0.0;
    /// DeLong's paired test; empty with fewer than two patients on either side or when the variance is 0.
    std::optional<double> standard_error, z, p_two_sided;
    std::optional<BootstrapInterval> interval;
};

/// Difference of two Hand-Till M.
struct HandTillDifference {
    double first = 0.0, second = 0.0, difference = 0.0;
    std::optional<BootstrapInterval> interval;
};

struct PairedComparison {
    PairedDifference log_score;                       ///< below 0: the first is better
    PairedDifference brier;                           ///< below 0: the first is better
    PairedDifference top_1;                           ///< above 0: the first is better
    std::vector<std::optional<AreaDifference>> area;  ///< K entries; empty without cases or without others
    std::optional<HandTillDifference> hand_till;      ///< empty when fewer than two causes have cases
};

/// @throws DomainError
[[nodiscard]] PairedComparison compare_paired(const PairedSample& sample,
                                              const ResamplingOptions& options = {});

}  // namespace steelyard::engine
