// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/beta_ratio.hpp"

#include <algorithm>
#include <boost/math/quadrature/tanh_sinh.hpp>
#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/digamma.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/math/special_functions/trigamma.hpp>
#include <cmath>
#include <limits>
#include <optional>
#include <string_view>
#include <vector>

#include "guards.hpp"
#include "monotone_root.hpp"
#include "steelyard/engine/boost_policy.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

/// Inside the quadrature double precision is enough.
using Quick = boost_policies::normalise<BoostPolicy, boost_policies::promote_double<false>>::type;

void check_shape(std::string_view function, std::string_view argument, const BetaShape& shape) {
    check_positive(function, argument, shape.a);
    check_positive(function, argument, shape.b);
}

/// ln(1 + e^x).
double softplus(double x) {
    return std::max(x, 0.0) + std::log1p(std::exp(-std::abs(x)));
}

double logistic(double x) {
    return x >= 0.0 ? 1.0 / (1.0 + std::exp(-x)) : std::exp(x) / (1.0 + std::exp(x));
}

/// The density of logit p, p ~ Beta: smooth on the whole line with one mode and exponential tails, whatever
/// the shapes.
class LogitDensity {
  public:
    explicit LogitDensity(const BetaShape& shape)
        : shape_(shape),
          mode_(std::log(shape.a / shape.b)),
          log_constant_(boost::math::lgamma(shape.a + shape.b, BoostPolicy()) -
                        boost::math::lgamma(shape.a, BoostPolicy()) -
                        boost::math::lgamma(shape.b, BoostPolicy())) {}

    double mode() const { return mode_; }
    double operator()(double s) const { return std::exp(log_constant_ + kernel(s)); }

    /// Where the density has fallen by e^45 from its mode, to the left (side = -1) or right (+1): beyond lies
    /// less than rounding.
    double end(double side) const {
        constexpr double fall = 45.0;
        const auto remaining = [&](double distance) {
            return kernel(mode_ + side * distance) - kernel(mode_) + fall;
        };
        return mode_ + side * detail::root_of_decreasing(remaining, 0.0, 1.0);
    }

  private:
    double kernel(double s) const { return shape_.a * s - (shape_.a + shape_.b) * softplus(s); }

    BetaShape shape_;
    double mode_;
    double log_constant_;
};

double cdf_unchecked(const BetaShape& numerator, const BetaShape& denominator, double r) {
    static boost::math::quadrature::tanh_sinh<double>
        rule;  // its integrate() is not const, yet safe to share
    const LogitDensity density(denominator);
    const double left = density.end(-1.0);
    double right = density.end(1.0);
    double sum = 0.0;
    if (r > 1.0) {
        // Beyond p0 = 1/r every p1 counts; the integrand has its corner there, so the range ends there.
        sum = boost::math::ibetac(denominator.a, denominator.b, 1.0 / r, BoostPolicy());
        right = std::min(right, -std::log(r - 1.0));
    }
    if (!(left < right)) {
        return std::min(sum, 1.0);
    }
    // Cut where the integrand is steep: at the mode of p0, and about the p0 at which r p0 is a typical p1.
    std::vector<double> cuts{left, right, density.mode()};
    const double typical = numerator.a / (numerator.a + numerator.b) / r;
    if (typical < 1.0) {
        const double at = std::log(typical / (1.0 - typical));
        const double spread = std::sqrt(boost::math::trigamma(numerator.a, BoostPolicy()));
        cuts.insert(cuts.end(), {at - 6.0 * spread, at, at + 6.0 * spread});
    }
    std::sort(cuts.begin(), cuts.end());
    const auto integrand = [&](double s, double /*to_end*/) {
        const double p1 = std::min(1.0, r * logistic(s));
        return boost::math::ibeta(numerator.a, numerator.b, p1, Quick()) * density(s);
    };
    for (std::size_t i = 1; i < cuts.size(); ++i) {
        const double from = std::max(cuts[i - 1], left);
        const double to = std::min(cuts[i], right);
        if (from < to) {
            // The tolerance is of the level before the last; the error is about its square.
            sum += rule.integrate(integrand, from, to, 1e-9);
        }
    }
    return std::min(sum, 1.0);
}

}  // namespace

BetaShape band_margin(const Eigen::Ref<const Eigen::ArrayXd>& alpha, Eigen::Index band) {
    check_size_at_least("band_margin", "alpha", alpha.size(), 2);
    check_index("band_margin", "band", band, alpha.size());
    check_all_positive("band_margin", "alpha", alpha, std::numeric_limits<double>::max(), "finite and > 0");
    // Summed, not subtracted: the rest of a row dominated by one band would lose its digits.
    double rest = 0.0;
    for (Eigen::Index i = 0; i < alpha.size(); ++i) {
        rest += i == band ? 0.0 : alpha(i);
    }
    return {alpha(band), rest};
}

double beta_quantile(const BetaShape& shape, double q) {
    check_shape("beta_quantile", "shape", shape);
    if (!(q > 0.0 && q < 1.0)) {
        throw DomainError("beta_quantile", "q", std::nullopt, std::nullopt, q, "above 0 and below 1");
    }
    return with_boost("beta_quantile", "q", q,
                      [&] { return boost::math::ibeta_inv(shape.a, shape.b, q, BoostPolicy()); });
}

LogRatioMoments log_ratio_moments(const BetaShape& numerator, const BetaShape& denominator) {
    check_shape("log_ratio_moments", "numerator", numerator);
    check_shape("log_ratio_moments", "denominator", denominator);
    const auto digamma = [](double x) { return boost::math::digamma(x, BoostPolicy()); };
    const auto trigamma = [](double x) { return boost::math::trigamma(x, BoostPolicy()); };
    return {(digamma(numerator.a) - digamma(numerator.a + numerator.b)) -
                (digamma(denominator.a) - digamma(denominator.a + denominator.b)),
            (trigamma(numerator.a) - trigamma(numerator.a + numerator.b)) +
                (trigamma(denominator.a) - trigamma(denominator.a + denominator.b))};
}

double beta_ratio_cdf(const BetaShape& numerator, const BetaShape& denominator, double r) {
    check_shape("beta_ratio_cdf", "numerator", numerator);
    check_shape("beta_ratio_cdf", "denominator", denominator);
    check_positive("beta_ratio_cdf", "r", r);
    return with_boost("beta_ratio_cdf", "r", r, [&] { return cdf_unchecked(numerator, denominator, r); });
}

double beta_ratio_quantile(const BetaShape& numerator, const BetaShape& denominator, double q) {
    check_shape("beta_ratio_quantile", "numerator", numerator);
    check_shape("beta_ratio_quantile", "denominator", denominator);
    check_between("beta_ratio_quantile", "q", q, 1e-6, 1.0 - 1e-6);
    const LogRatioMoments moments = log_ratio_moments(numerator, denominator);
    const double spread = std::max(std::sqrt(moments.variance), std::numeric_limits<double>::epsilon());
    const auto remaining = [&](double log_ratio) {
        return q - cdf_unchecked(numerator, denominator, std::exp(log_ratio));
    };
    return with_boost("beta_ratio_quantile", "q", q,
                      [&] { return std::exp(detail::root_of_decreasing(remaining, moments.mean, spread)); });
}

}  // namespace steelyard::engine
