// SPDX-License-Identifier: Apache-2.0
#include "quantile_table.hpp"

#include <algorithm>
#include <boost/math/interpolators/cardinal_cubic_b_spline.hpp>
#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/erf.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>

#include "normal_tail.hpp"
#include "steelyard/engine/boost_policy.hpp"

namespace steelyard::engine::detail {
namespace {

/// Good to a hundred-thousandth of a standard deviation is enough here, so nothing is taken in extended
/// precision.
using Quick = boost_policies::normalise<BoostPolicy, boost_policies::promote_double<false>>::type;

constexpr double reach = 6.6;  // normal deviates; 2^-33 lies at -6.34
constexpr int nodes_in_z = 45;
constexpr double step_in_z = 2.0 * reach / (nodes_in_z - 1);
constexpr double large_shape = 1e6;
constexpr double least_log = -690.0;  // ln 1e-300: no table tells smaller shares apart

double normal_deviate(double lower) {
    return -std::sqrt(2.0) * boost::math::erfc_inv(2.0 * lower, Quick());
}

/// The normal deviates of the grid of u, lower half: the same for every table.
const std::vector<double>& grid_deviates() {
    static const std::vector<double> deviates = [] {
        std::vector<double> z;
        for (int octave = 33; octave > 1; --octave) {
            for (int part = 0; part < 32; ++part) {
                z.push_back(normal_deviate(std::ldexp(1.0 + part / 32.0, -octave)));
            }
        }
        z.push_back(0.0);
        z.push_back(0.0);  // u = 1/2 itself looks one node further, with weight 0
        return z;
    }();
    return deviates;
}

/// ln x from the leading term of its distribution function where x itself would underflow: P(X <= x) = c
/// x^power.
double leading_log(double lower, double power, double log_c) {
    return (std::log(lower) - log_c) / power;
}

}  // namespace

QuantileTable::QuantileTable(const std::function<double(double lower, double upper)>& quantile) {
    std::vector<double> value(nodes_in_z);
    for (int i = 0; i < nodes_in_z; ++i) {
        const double z = -reach + step_in_z * i;
        value[static_cast<std::size_t>(i)] = quantile(upper_tail(-z), upper_tail(z));
    }
    const boost::math::interpolators::cardinal_cubic_b_spline<double> spline(value.data(), value.size(),
                                                                             -reach, step_in_z);
    const std::vector<double>& grid = grid_deviates();
    lower_.reserve(grid.size());
    upper_.reserve(grid.size());
    for (const double z : grid) {
        lower_.push_back(spline(z));
        upper_.push_back(spline(-z));
    }
}

const QuantileTable& normal_quantiles() {
    static const QuantileTable table([](double lower, double upper) {
        return lower <= upper ? normal_deviate(lower) : -normal_deviate(upper);
    });
    return table;
}

QuantileTable log_beta_quantiles(double a, double b) {
    const double log_c = boost::math::lgamma(a + b, Quick()) - boost::math::lgamma(a + 1.0, Quick()) -
                         boost::math::lgamma(b, Quick());
    return QuantileTable([=](double lower, double upper) {
        const double small = leading_log(lower, a, log_c);
        if (small < -600.0) {
            return std::max(small, least_log);
        }
        double complement = 0.0;
        const double x = lower <= upper ? boost::math::ibeta_inv(a, b, lower, &complement, Quick())
                                        : boost::math::ibetac_inv(a, b, upper, &complement, Quick());
        return std::max(x < 0.5 ? std::log(x) : std::log1p(-complement), least_log);
    });
}

QuantileTable log_gamma_quantiles(double shape) {
    if (shape > large_shape) {
        // The cube root of a Gamma variable is nearly normal (Wilson and Hilferty 1931, from memory): right
        // to 1e-9 of ln x from here on, where the exact series no longer converges.
        return QuantileTable([shape](double lower, double upper) {
            const double z = lower <= upper ? normal_deviate(lower) : -normal_deviate(upper);
            return std::log(shape) + 3.0 * std::log1p(-1.0 / (9.0 * shape) + z / (3.0 * std::sqrt(shape)));
        });
    }
    const double log_c = -boost::math::lgamma(shape + 1.0, Quick());
    return QuantileTable([=](double lower, double upper) {
        // A weight may be as small as it likes: only its logarithm is kept, and no share is told of it.
        const double small = leading_log(lower, shape, log_c);
        if (small < -600.0) {
            return small;
        }
        return std::log(lower <= upper ? boost::math::gamma_p_inv(shape, lower, Quick())
                                       : boost::math::gamma_q_inv(shape, upper, Quick()));
    });
}

QuantileTable relative_sd_quantiles(double degrees) {
    const double shape = degrees / 2.0;
    return QuantileTable([=](double lower, double upper) {
        const double x = lower <= upper ? boost::math::gamma_p_inv(shape, lower, Quick())
                                        : boost::math::gamma_q_inv(shape, upper, Quick());
        return std::sqrt(x / shape);
    });
}

}  // namespace steelyard::engine::detail
