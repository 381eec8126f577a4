// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/distributions.hpp"

#include <boost/math/distributions/complement.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <numbers>
#include <optional>
#include <string_view>

#include "steelyard/engine/boost_policy.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "student_t.hpp"

namespace steelyard::engine {
namespace {

using Normal = boost::math::normal_distribution<double, BoostPolicy>;
using StudentT = boost::math::students_t_distribution<long double, BoostPolicy>;

void check_number(std::string_view function, std::string_view argument, double value) {
    if (std::isnan(value)) {
        throw DomainError(function, argument, std::nullopt, std::nullopt, value, "a number or an infinity");
    }
}

void check_inside(std::string_view function, double p) {
    if (!(p > 0.0 && p < 1.0)) {
        throw DomainError(function, "p", std::nullopt, std::nullopt, p, "> 0 and < 1");
    }
}

}  // namespace

double normal_lower(double z) {
    check_number("normal_lower", "z", z);
    return with_boost("normal_lower", "z", z, [z] { return boost::math::cdf(Normal(), z); });
}

double normal_upper(double z) {
    check_number("normal_upper", "z", z);
    return with_boost("normal_upper", "z", z,
                      [z] { return boost::math::cdf(boost::math::complement(Normal(), z)); });
}

double normal_quantile(double p) {
    check_inside("normal_quantile", p);
    return with_boost("normal_quantile", "p", p, [p] { return boost::math::quantile(Normal(), p); });
}

double student_t_upper(double t, double degrees) {
    check_number("student_t_upper", "t", t);
    check_positive("student_t_upper", "degrees", degrees);
    return with_boost("student_t_upper", "t", t, [t, degrees] {
        const long double tail = student_t_tail(std::abs(t), degrees);
        return static_cast<double>(t < 0.0 ? 1.0L - tail : tail);
    });
}

double student_t_quantile(double p, double degrees) {
    check_inside("student_t_quantile", p);
    check_positive("student_t_quantile", "degrees", degrees);
    return with_boost("student_t_quantile", "p", p, [p, degrees] {
        return static_cast<double>(boost::math::quantile(StudentT(degrees), static_cast<long double>(p)));
    });
}

long double student_t_tail(long double t, long double degrees) {
    if (std::isinf(t)) {
        return 0.0L;
    }
    if (degrees == 1.0L) {
        // The Cauchy law in closed form; atan2 keeps the tail's relative accuracy for any t.
        return std::atan2(1.0L, t) / std::numbers::pi_v<long double>;
    }
    return boost::math::cdf(boost::math::complement(StudentT(degrees), t));
}

long double student_t_between(long double low, long double high, long double degrees) {
    if (low >= 0.0L) {
        return student_t_tail(low, degrees) - student_t_tail(high, degrees);
    }
    if (high <= 0.0L) {
        return student_t_tail(-high, degrees) - student_t_tail(-low, degrees);
    }
    return 1.0L - student_t_tail(-low, degrees) - student_t_tail(high, degrees);
}

}  // namespace steelyard::engine
