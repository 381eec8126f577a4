// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether a forecast of 30 % comes true three times in ten, cause by cause: Cox's intercept and slope
// (Biometrika 1958;45:562, from memory), calibration in the large, and Spiegelhalter's z (Stat Med
// 1986;5:421, abstract seen). docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>

#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/logistic.hpp"
#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {

/// Why a fit has an answer, or none.
enum class FitStatus {
    found,
    no_case,            ///< nobody has the cause (or one of the causes)
    only_cases,         ///< everybody has it
    constant_forecast,  ///< all forecasts are equal: a slope has nothing to go by
    separated,          ///< forecasts sort the outcomes without error: the best coefficients are infinite
    too_many_causes,    ///< more causes than the full recalibration is offered for
    no_maximum_reached  ///< the steps ran out; has not been seen to happen
};

/// One cause against the rest.
struct CauseCalibration {
    double mean_forecast = 0.0, observed_share = 0.0;
    /// logit P(y) = intercept + slope logit p. Slope below 1: too sure. Present when status is `found`.
    std::optional<CoxCalibration> cox;
    FitStatus status = FitStatus::found;
    std::optional<IntervalEstimate> intercept, slope;  ///< Wald: estimate -/+ z standard error
    /// The intercept when the slope is held at 1, not the one above. Above 0: the cause is commoner than
    /// forecast. Empty when nobody or everybody has the cause.
    std::optional<IntervalEstimate> in_the_large;  ///< Wald
    std::optional<double> in_the_large_error;      ///< standard error, 1 / sqrt(sum p (1 - p)) at the fit
};

/// @param cause  0-based   @param level  in (0, 1)   @throws DomainError  arguments only; data that cannot be
/// fitted
///                                                                      show in `status`
[[nodiscard]] CauseCalibration cause_calibration(const AuditSample& sample, Eigen::Index cause,
                                                 double level = 0.95);

/// A sum of scores against what calibrated forecasts would give, in standard deviations.
struct CalibrationTest {
    double z = 0.0;
    double p_two_sided = 1.0;  ///< from the normal law
};

/// Spiegelhalter's: z = sum (d - p)(1 - 2p) / sqrt(sum (1 - 2p)^2 p (1 - p)). It weighs by 1 - 2p and so is
/// blind near p = 1/2: beside slope and intercept, not in their place. @returns empty when its variance is 0
[[nodiscard]] std::optional<CalibrationTest> spiegelhalter_test(const AuditSample& sample,
                                                                Eigen::Index cause);

/// The same for the Brier score summed over causes: under calibration a patient's has mean 1 - sum p^2 and
/// variance 4 [sum p^3 - (sum p^2)^2] (derived in docs/method.md). Above 0: worse than the forecasts expect,
/// too sure.
[[nodiscard]] std::optional<CalibrationTest> spiegelhalter_test_all(const AuditSample& sample);

/// The same for the log score: mean -sum p ln p, variance sum p ln^2 p - (sum p ln p)^2.
[[nodiscard]] std::optional<CalibrationTest> log_score_test(const AuditSample& sample);

}  // namespace steelyard::engine
