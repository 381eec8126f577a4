// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/variance_shares.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <string_view>

#include "guards.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

double mean(const Eigen::Ref<const Eigen::ArrayXd>& x) {
    return compensated_sum(x) / static_cast<double>(x.size());
}

double standard_error(const Eigen::Ref<const Eigen::ArrayXd>& x) {
    const auto count = static_cast<double>(x.size());
    return std::sqrt(compensated_sum((x - mean(x)).square()) / ((count - 1.0) * count));
}

}  // namespace

VarianceShares variance_shares(const Eigen::Ref<const Eigen::ArrayXd>& f_a,
                               const Eigen::Ref<const Eigen::ArrayXd>& f_b,
                               const Eigen::Ref<const Eigen::ArrayXXd>& f_ab) {
    constexpr std::string_view name = "variance_shares";
    check_size_at_least(name, "f_a", f_a.size(), 1);
    check_size(name, "f_b", f_b.size(), f_a.size());
    check_size(name, "f_ab rows", f_ab.rows(), f_a.size());
    check_all_between(name, "f_a", f_a, -infinity, infinity);
    check_all_between(name, "f_b", f_b, -infinity, infinity);
    check_all_between(name, "f_ab", f_ab, -infinity, infinity);

    VarianceShares shares;
    shares.first = Eigen::ArrayXd::Zero(f_ab.cols());
    shares.total = Eigen::ArrayXd::Zero(f_ab.cols());
    // Halved before they are taken from each other: a difference of two finite numbers may overflow.
    const double lowest = std::min(f_a.minCoeff(), f_b.minCoeff());
    const double highest = std::max(f_a.maxCoeff(), f_b.maxCoeff());
    const double half_spread = highest / 2.0 - lowest / 2.0;
    const double largest = std::max(std::abs(lowest), std::abs(highest));
    if (half_spread <= 4.0 * std::numeric_limits<double>::epsilon() * largest) {
        return shares;
    }
    // On the scale of its spread f is neither too large nor too small to be squared.
    const auto scaled = [&](const Eigen::Ref<const Eigen::ArrayXd>& f) -> Eigen::ArrayXd {
        return (f / 2.0 - lowest / 2.0) / half_spread;
    };
    Eigen::ArrayXd a = scaled(f_a);
    Eigen::ArrayXd b = scaled(f_b);
    const double centre = (mean(a) + mean(b)) / 2.0;
    a -= centre;
    b -= centre;
    const double variance = (mean(a.square()) + mean(b.square())) / 2.0;
    for (Eigen::Index i = 0; i < f_ab.cols(); ++i) {
        const Eigen::ArrayXd step = scaled(f_ab.col(i)) - centre - a;
        shares.first(i) = mean(b * step) / variance;
        shares.total(i) = mean(step.square()) / (2.0 * variance);
    }
    shares.variance = variance * (2.0 * half_spread) * (2.0 * half_spread);
    shares.varies = true;
    return shares;
}

ReplicatedShares replicated_shares(const std::vector<VarianceShares>& replicates) {
    constexpr std::string_view name = "replicated_shares";
    const auto count = static_cast<Eigen::Index>(replicates.size());
    check_size_at_least(name, "replicates", count, 2);
    const Eigen::Index sources = replicates.front().first.size();
    Eigen::ArrayXXd first(count, sources);
    Eigen::ArrayXXd total(count, sources);
    Eigen::ArrayXd variance(count);
    ReplicatedShares result;
    for (Eigen::Index r = 0; r < count; ++r) {
        const VarianceShares& one = replicates[static_cast<std::size_t>(r)];
        check_size(name, "first", one.first.size(), sources);
        check_size(name, "total", one.total.size(), sources);
        first.row(r) = one.first.transpose();
        total.row(r) = one.total.transpose();
        variance(r) = one.variance;
        result.varies = result.varies || one.varies;
    }
    check_all_between(name, "first", first, -infinity, infinity);
    check_all_between(name, "total", total, -infinity, infinity);
    result.first.resize(sources);
    result.first_error.resize(sources);
    result.total.resize(sources);
    result.total_error.resize(sources);
    for (Eigen::Index i = 0; i < sources; ++i) {
        result.first(i) = mean(first.col(i));
        result.first_error(i) = standard_error(first.col(i));
        result.total(i) = mean(total.col(i));
        result.total_error(i) = standard_error(total.col(i));
    }
    result.variance = mean(variance);
    return result;
}

}  // namespace steelyard::engine
