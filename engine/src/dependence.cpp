// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/dependence.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <string_view>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

void check_joint(std::string_view function, std::string_view argument,
                 const Eigen::Ref<const Eigen::ArrayXXd>& joint) {
    check_size_at_least(function, std::string(argument) + " rows", joint.rows(), 2);
    check_size_at_least(function, std::string(argument) + " columns", joint.cols(), 2);
    check_all_between(function, argument, joint, 0.0, 1.0);
    const double sum = joint.sum();
    if (!(std::abs(sum - 1.0) <= 1e-9)) {
        throw DomainError(function, std::string(argument) + " sum", std::nullopt, std::nullopt, sum,
                          "1 within 1e-9");
    }
}

}  // namespace

Eigen::ArrayXXd joint_probability(const Eigen::Ref<const Eigen::ArrayXXd>& counts, double start) {
    check_size_at_least("joint_probability", "counts rows", counts.rows(), 2);
    check_size_at_least("joint_probability", "counts columns", counts.cols(), 2);
    check_all_between("joint_probability", "counts", counts, 0.0, infinity);
    check_positive("joint_probability", "start", start);
    const Eigen::ArrayXXd shape = counts + start;
    return shape / shape.sum();
}

Eigen::ArrayXd first_margin(const Eigen::Ref<const Eigen::ArrayXXd>& joint) {
    check_joint("first_margin", "joint", joint);
    return joint.rowwise().sum();
}

Eigen::ArrayXd second_margin(const Eigen::Ref<const Eigen::ArrayXXd>& joint) {
    check_joint("second_margin", "joint", joint);
    return joint.colwise().sum().transpose();
}

Eigen::ArrayXd joint_loglik(const std::vector<Eigen::ArrayXXd>& joints, std::optional<Eigen::Index> first,
                            std::optional<Eigen::Index> second) {
    constexpr std::string_view name = "joint_loglik";
    check_size_at_least(name, "joints", static_cast<Eigen::Index>(joints.size()), 1);
    Eigen::ArrayXd loglik = Eigen::ArrayXd::Zero(static_cast<Eigen::Index>(joints.size()));
    for (Eigen::Index k = 0; k < loglik.size(); ++k) {
        const Eigen::ArrayXXd& joint = joints[static_cast<std::size_t>(k)];
        check_joint(name, "joints", joint);
        check_size(name, "joints rows", joint.rows(), joints.front().rows());
        check_size(name, "joints columns", joint.cols(), joints.front().cols());
        check_all_positive(name, "joints", joint, 1.0, "above 0 and at most 1");
        if (first) {
            check_index(name, "first", *first, joint.rows());
        }
        if (second) {
            check_index(name, "second", *second, joint.cols());
        }
        double share = 1.0;
        if (first && second) {
            share = joint(*first, *second);
        } else if (first) {
            share = joint.row(*first).sum();
        } else if (second) {
            share = joint.col(*second).sum();
        }
        loglik(k) = std::min(0.0, std::log(share));
    }
    return loglik;
}

double mutual_information(const Eigen::Ref<const Eigen::ArrayXXd>& joint) {
    const Eigen::ArrayXd rows = first_margin(joint);
    const Eigen::ArrayXd columns = second_margin(joint);
    double sum = 0.0;
    for (Eigen::Index j = 0; j < joint.cols(); ++j) {
        for (Eigen::Index i = 0; i < joint.rows(); ++i) {
            if (joint(i, j) > 0.0) {
                sum += joint(i, j) * std::log(joint(i, j) / (rows(i) * columns(j)));
            }
        }
    }
    return std::max(sum, 0.0);  // rounding can leave independence a little below 0
}

ReweightedFindings reweight_findings(const Eigen::Ref<const Eigen::ArrayXXd>& weight,
                                     const Eigen::Ref<const Eigen::ArrayXi>& y,
                                     const Eigen::Ref<const Eigen::ArrayXd>& count) {
    check_size_at_least("reweight_findings", "weight columns", weight.cols(), 1);
    ReweightedFindings result{fit_logistic(weight, y, count), {}};
    for (Eigen::Index j = 0; j < weight.cols(); ++j) {
        if (result.fit.coefficient(j + 1) < 0.0) {
            result.reversed.push_back(j);
        }
    }
    return result;
}

}  // namespace steelyard::engine
