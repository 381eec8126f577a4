// SPDX-License-Identifier: Apache-2.0
#pragma once
// The likelihood ratio of one band when both rows are known only up to a Dirichlet posterior: the band's
// share is a Beta variable in each row, and the ratio is that of two independent Betas. Its mean is infinite
// whenever the lower shape is 1 or less, so medians and quantiles are given. docs/method.md, "Likelihood
// ratios from counts".

#include <Eigen/Core>

namespace steelyard::engine {

/// A Beta distribution; both shapes finite and > 0.
struct BetaShape {
    double a = 1.0;
    double b = 1.0;
};

/// The margin of one band of a Dirichlet: Beta(alpha_band, sum of the others).
/// @param alpha  shape (B), B >= 2; finite, > 0   @param band  0-based, below B   @throws DomainError
[[nodiscard]] BetaShape band_margin(const Eigen::Ref<const Eigen::ArrayXd>& alpha, Eigen::Index band);

/// Quantile of a Beta distribution [1]. @param q  in (0, 1)  @throws DomainError
[[nodiscard]] double beta_quantile(const BetaShape& shape, double q);

/// Mean and variance of ln(p1 / p0), p1 and p0 independent Betas:
/// psi(a1) - psi(a1 + b1) - psi(a0) + psi(a0 + b0) and the sum of the trigammas with signs + - + -.
struct LogRatioMoments {
    double mean = 0.0;      ///< [nats]
    double variance = 0.0;  ///< [nats^2]
};
[[nodiscard]] LogRatioMoments log_ratio_moments(const BetaShape& numerator, const BetaShape& denominator);

/// P(p1 / p0 <= r), by quadrature over the logit of p0 (Takahasi and Mori's double-exponential rule), split
/// where r p0 reaches 1. Error below 1e-12 for shapes from 0.01 to 1e5.
/// @param r  ratio [1]; > 0, finite   @throws DomainError
[[nodiscard]] double beta_ratio_cdf(const BetaShape& numerator, const BetaShape& denominator, double r);

/// The ratio below which a share q of the posterior lies: the root of beta_ratio_cdf() on the log scale (TOMS
/// 748).
/// @param q  in [1e-6, 1 - 1e-6]   @throws DomainError
/// Cost: some milliseconds; row_ratio.hpp is the quick way for whole tables.
[[nodiscard]] double beta_ratio_quantile(const BetaShape& numerator, const BetaShape& denominator, double q);

}  // namespace steelyard::engine
