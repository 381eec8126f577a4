// SPDX-License-Identifier: Apache-2.0
#pragma once
// The ratio P(band | a) / P(band | b) of two compiled rows with an interval, for display of any cause against
// any other. The law of ln P(band | cause) is tabulated once per row and band; the quantiles of the
// difference of two such laws then cost microseconds. docs/method.md, "Likelihood ratios from counts".

#include <Eigen/Core>
#include <optional>

#include "steelyard/engine/proportion.hpp"
#include "steelyard/engine/row_forms.hpp"

namespace steelyard::engine {

/// The law of ln P(band | cause), as its distribution function on an even grid; straight between grid points.
///
/// Dirichlet: the logarithm of a Beta variable. Summary: the mean and variance drawn from their normal and
/// scaled-inverse-chi-square posterior, by quadrature over both; no draws, so the same row gives the same
/// interval always; a share below the law's `least` counts as `least`, as in the row itself. Ratio: normal
/// about ln p with the row's own standard deviation. Its reference row's uncertainty comes on top when that
/// row is given; it is left out when the ratio is shown against that very reference, where it cancels.
class LogShareLaw {
  public:
    /// @param row        compiled row; shape (B)
    /// @param band       0-based, below B
    /// @param reference  row that a RatioLaw's ratios are against, itself not a RatioLaw; empty: held fixed
    /// @throws DomainError
    LogShareLaw(const CompiledRow& row, Eigen::Index band, const CompiledRow* reference = nullptr);

    /// A share that is known: no uncertainty. @param share  in (0, 1]  @throws DomainError
    static LogShareLaw fixed(double share);

    /// The band probability the weighing uses [1].
    double share() const noexcept { return share_; }
    /// Standard deviation of the tabulated law [nats].
    double standard_deviation() const noexcept { return sd_; }
    /// P(ln share <= x). @param x [nats]
    double cdf(double x) const;
    /// The x with cdf(x) = q [nats]. @param q  in (0, 1)
    double quantile(double q) const;

  private:
    LogShareLaw() = default;
    friend double log_ratio_quantile(const LogShareLaw& a, const LogShareLaw& b, double q);

    double share_ = 1.0;
    double sd_ = 0.0;
    double start_ = 0.0;  // first grid point [nats]
    double step_ = 0.0;   // 0: all mass at start_
    Eigen::ArrayXd cdf_;  // shape (points), 0 to 1
};

/// Quantile of ln(p_a / p_b), a and b independent [nats]. The wider law is integrated exactly as tabulated,
/// the narrower one stands at the middle of its cells. @param q  in (0, 1)  @throws DomainError
[[nodiscard]] double log_ratio_quantile(const LogShareLaw& a, const LogShareLaw& b, double q);

/// The ratio of the two shares as used in weighing, with the equal-tailed interval of its uncertainty.
/// Against the exact quantiles of a ratio of Betas the limits of ln ratio are right within 1 % of the
/// interval's width. The share used may lie outside the interval when a law is so lopsided that its mean is
/// beyond its outer quantile; the interval is then widened to hold it.
/// @param level  in (0, 1)
/// @returns      low <= value <= high; low is 0 and high infinite where they leave the range of a double
/// @throws DomainError
[[nodiscard]] IntervalEstimate row_ratio_interval(const LogShareLaw& a, const LogShareLaw& b,
                                                  double level = 0.95);

/// The same straight from two rows; for whole tables keep the laws. @throws DomainError
[[nodiscard]] IntervalEstimate row_ratio_interval(const CompiledRow& a, const CompiledRow& b,
                                                  Eigen::Index band, double level = 0.95);

}  // namespace steelyard::engine
