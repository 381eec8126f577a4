// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/log_math.hpp"

#include <cmath>
#include <limits>
#include <numbers>
#include <optional>

#include "exact_sum.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

/// Where the largest entry stands (the first of several); -1 when there is none above -inf. NaN is never the
/// largest.
Eigen::Index place_of_largest(const Eigen::Ref<const Eigen::ArrayXd>& x) {
    Eigen::Index place = -1;
    double largest = -infinity;
    for (Eigen::Index i = 0; i < x.size(); ++i) {
        if (x(i) > largest) {
            largest = x(i);
            place = i;
        }
    }
    return place;
}

}  // namespace

double log_sum_exp(const Eigen::Ref<const Eigen::ArrayXd>& x) {
    if (x.isNaN().any()) {
        return std::numeric_limits<double>::quiet_NaN();
    }
    const Eigen::Index leader = place_of_largest(x);
    if (leader < 0) {
        return -infinity;
    }
    if (x(leader) == infinity) {
        return infinity;
    }
    ExactSum rest;  // of the others, so that log1p keeps a remainder that is small beside the leader's 1
    for (Eigen::Index i = 0; i < x.size(); ++i) {
        if (i != leader) {
            rest.add(std::exp(x(i) - x(leader)));
        }
    }
    return x(leader) + std::log1p(rest.value());
}

Eigen::ArrayXd softmax(const Eigen::Ref<const Eigen::ArrayXd>& x) {
    if (x.size() == 0) {
        return {};
    }
    for (Eigen::Index i = 0; i < x.size(); ++i) {
        if (std::isnan(x(i)) || x(i) == infinity) {
            throw DomainError("softmax", "x", i, std::nullopt, x(i), "finite or -inf");
        }
    }
    const Eigen::Index leader = place_of_largest(x);
    if (leader < 0) {
        throw DomainError("softmax", "largest x", std::nullopt, std::nullopt, -infinity, "finite");
    }
    Eigen::ArrayXd share(x.size());
    ExactSum sum;
    for (Eigen::Index i = 0; i < x.size(); ++i) {
        share(i) = std::exp(x(i) - x(leader));
        sum.add(share(i));
    }
    share /= sum.value();
    return share;
}

double log1m_exp(double x) {
    if (!(x <= 0.0)) {
        throw DomainError("log1m_exp", "x", std::nullopt, std::nullopt, x, "<= 0");
    }
    if (x > -std::numbers::ln2) {
        return std::log(-std::expm1(x));
    }
    return std::log1p(-std::exp(x));
}

double compensated_sum(const Eigen::Ref<const Eigen::ArrayXd>& x) {
    double sum = 0.0;
    double lost = 0.0;
    for (Eigen::Index i = 0; i < x.size(); ++i) {
        const double term = x(i);
        const double next = sum + term;
        lost += std::abs(sum) >= std::abs(term) ? (sum - next) + term : (term - next) + sum;
        sum = next;
    }
    return std::isfinite(sum) ? sum + lost : sum;  // the errors around an infinity are not numbers
}

}  // namespace steelyard::engine
