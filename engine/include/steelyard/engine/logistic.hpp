// SPDX-License-Identifier: Apache-2.0
#pragma once
// Binary logistic regression by maximum likelihood, and with it the intercept and slope by which Cox judged
// forecasts (Biometrika 1958;45:562). docs/method.md, "Dependence".

#include <Eigen/Core>

namespace steelyard::engine {

/// A binary logistic regression by maximum likelihood.
struct LogisticFit {
    Eigen::ArrayXd coefficient;     ///< shape (p + 1): intercept, then one per column
    Eigen::ArrayXd standard_error;  ///< shape (p + 1), from the information at the maximum
    double loglik = 0.0;            ///< [nats]
    int steps = 0;                  ///< Newton steps taken
};

/// Fits logit P(y = 1) = b0 + sum b_j x_j by Newton's method (iteratively re-weighted least squares) with
/// steps halved until the likelihood rises.
/// @param x      shape (N, p), p >= 0; finite   @param y  shape (N); 0 or 1, both present
/// @param count  patients per line; shape (N); > 0
/// @throws DomainError  `x columns` when a column is a combination of the others and the intercept;
/// `separations of y by
///                      x` when some combination of the columns sorts the outcomes without error, so that the
///                      estimates run to infinity
[[nodiscard]] LogisticFit fit_logistic(const Eigen::Ref<const Eigen::ArrayXXd>& x,
                                       const Eigen::Ref<const Eigen::ArrayXi>& y,
                                       const Eigen::Ref<const Eigen::ArrayXd>& count);

/// Intercept and slope of y on the log odds of the forecast (Cox 1958). Slope below 1: the forecasts are too
/// sure.
struct CoxCalibration {
    double intercept = 0.0, intercept_error = 0.0;
    double slope = 1.0, slope_error = 0.0;
    double loglik = 0.0;
};
/// @param log_odds  forecast ln(p / (1 - p)) [nats]; shape (N); finite   Other parameters and errors as
/// fit_logistic().
[[nodiscard]] CoxCalibration cox_calibration(const Eigen::Ref<const Eigen::ArrayXd>& log_odds,
                                             const Eigen::Ref<const Eigen::ArrayXi>& y,
                                             const Eigen::Ref<const Eigen::ArrayXd>& count);

}  // namespace steelyard::engine
