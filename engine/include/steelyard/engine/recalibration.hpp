// SPDX-License-Identifier: Apache-2.0
#pragma once
// What would have to be done to all causes' forecasts at once to make them fit the final causes: multinomial
// recalibration (Van Hoorde et al., Stat Med 2014;33:2585, abstract seen), and one exponent on all forecasts
// (temperature). docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>

#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/calibration.hpp"
#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {

/// Twice the rise of the log likelihood, against chi-square.
struct LikelihoodRatioTest {
    double chi2 = 0.0;
    Eigen::Index degrees = 0;
    double p = 1.0;
};

/// ln P(y = k) / P(y = ref) = a_k + sum over j of b_kj ln(p_j / p_ref), the other causes in their order as
/// rows and as columns.
struct Recalibration {
    Eigen::Index reference = 0;  ///< cause
    FitStatus status = FitStatus::found;
    Eigen::ArrayXXd coefficient;     ///< shape (K - 1, K): a_k, then b_kj; calibrated: 0 and the identity
    Eigen::ArrayXXd standard_error;  ///< same shape
    double loglik = 0.0;             ///< of the final causes at the fit [nats]
    FitStatus intercepts_status = FitStatus::found;
    Eigen::ArrayXd intercept;        ///< shape (K - 1): with the slopes held at the identity
    Eigen::ArrayXd intercept_error;  ///< same shape
    double intercepts_loglik = 0.0;
    double forecast_loglik = 0.0;                                ///< of the forecasts as they are
    std::optional<LikelihoodRatioTest> intercepts_against_none;  ///< K - 1 degrees of freedom
    std::optional<LikelihoodRatioTest> full_against_none;        ///< K (K - 1)
    std::optional<LikelihoodRatioTest> full_against_intercepts;  ///< (K - 1)^2
};

inline constexpr Eigen::Index most_recalibrated_causes =
    24;  ///< beyond, 600 coefficients and more: not offered

/// Both fits by Newton's method. The fit itself and its tests do not depend on the reference cause, the
/// coefficients do. An own slope for each cause and no others is not offered: that fit depends on the
/// reference. Arrays are empty where the status is not `found`. With a cause that nobody has, neither is
/// estimable (`no_case`).
/// @param reference  0-based cause   @throws DomainError  arguments only
[[nodiscard]] Recalibration recalibrate(const AuditSample& sample, Eigen::Index reference = 0);

/// The exponent t of p_k^t, renormalised, that makes the final causes likeliest; 1 / t is the temperature.
/// Below 1: too sure.
struct TemperatureFit {
    FitStatus status =
        FitStatus::found;  ///< `separated` when the final cause always leads, so that no finite
                           ///< exponent is best; `constant_forecast` when all forecasts are 1 / K
    std::optional<IntervalEstimate>
        exponent;                          ///< Wald, cut at 0; [0, 0] when forecasts mislead and 0 is best
    std::optional<double> standard_error;  ///< empty also when the exponent is held at 0
    double loglik = 0.0;                   ///< at the exponent [nats]
};
/// @param level  in (0, 1)   @throws DomainError
[[nodiscard]] TemperatureFit temperature(const AuditSample& sample, double level = 0.95);

}  // namespace steelyard::engine
