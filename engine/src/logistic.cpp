// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/logistic.hpp"

#include <Eigen/Cholesky>
#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>
#include <string_view>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr std::string_view name = "fit_logistic";

double softplus(double x) {
    return std::max(x, 0.0) + std::log1p(std::exp(-std::abs(x)));
}

/// First and (negative) second derivatives of the log likelihood.
struct Slope {
    Eigen::VectorXd gradient;
    Eigen::MatrixXd information;
};

/// The regression as data: a column of ones before x, and each outcome as +1 or -1.
struct Problem {
    Eigen::MatrixXd design;  // shape (N, p + 1)
    Eigen::ArrayXd side;     // shape (N)
    Eigen::ArrayXd count;    // shape (N)

    double loglik(const Eigen::VectorXd& coefficient) const {
        const Eigen::ArrayXd margin = side * (design * coefficient).array();
        double sum = 0.0;
        for (Eigen::Index i = 0; i < margin.size(); ++i) {
            sum -= count(i) * softplus(-margin(i));
        }
        return sum;
    }

    Slope slope(const Eigen::VectorXd& coefficient) const {
        const Eigen::ArrayXd margin = side * (design * coefficient).array();
        // Of each outcome: the probability of the other one, which is what still pulls.
        const Eigen::ArrayXd other = 1.0 / (1.0 + margin.exp());
        const Eigen::ArrayXd curvature = count * other * (1.0 - other);
        return {design.transpose() * (count * side * other).matrix(),
                design.transpose() * curvature.matrix().asDiagonal() * design};
    }

    /// Whether going along `direction` for ever makes no outcome less likely and some more: then there is no
    /// maximum (Albert and Anderson, Biometrika 1984;71:1). Margins within rounding of 0 count as 0.
    bool separates(const Eigen::VectorXd& direction) const {
        const Eigen::ArrayXd gain = side * (design * direction).array();
        const double largest = gain.abs().maxCoeff();
        return largest > 0.0 && gain.minCoeff() >= -1e-9 * largest;
    }
};

Problem checked_problem(const Eigen::Ref<const Eigen::ArrayXXd>& x, const Eigen::Ref<const Eigen::ArrayXi>& y,
                        const Eigen::Ref<const Eigen::ArrayXd>& count) {
    check_size_at_least(name, "x rows", x.rows(), 2);
    check_size(name, "y", y.size(), x.rows());
    check_size(name, "count", count.size(), x.rows());
    check_all_between(name, "x", x, -infinity, infinity);
    check_all_positive(name, "count", count, infinity, "finite and > 0");
    for (Eigen::Index i = 0; i < y.size(); ++i) {
        if (y(i) != 0 && y(i) != 1) {
            throw DomainError(name, "y", i, std::nullopt, y(i), "0 or 1");
        }
    }
    if (y.minCoeff() == y.maxCoeff()) {
        throw DomainError(name, "y", std::nullopt, std::nullopt, y(0), "0 for some and 1 for others");
    }
    Problem problem{Eigen::MatrixXd(x.rows(), x.cols() + 1), 2.0 * y.cast<double>() - 1.0, count};
    problem.design.col(0).setOnes();
    problem.design.rightCols(x.cols()) = x.matrix();
    // Columns brought to one length: being a combination of others does not depend on units.
    Eigen::MatrixXd scaled = problem.design;
    for (Eigen::Index j = 0; j < scaled.cols(); ++j) {
        const double length = scaled.col(j).stableNorm();
        scaled.col(j) /= length > 0.0 ? length : 1.0;
    }
    Eigen::ColPivHouseholderQR<Eigen::MatrixXd> qr(scaled);
    qr.setThreshold(1e-11);
    if (qr.rank() < scaled.cols()) {
        throw DomainError(name, "x columns", std::nullopt, std::nullopt, static_cast<double>(qr.rank() - 1),
                          "independent of each other and of the intercept: " + std::to_string(x.cols()));
    }
    return problem;
}

}  // namespace

LogisticFit fit_logistic(const Eigen::Ref<const Eigen::ArrayXXd>& x,
                         const Eigen::Ref<const Eigen::ArrayXi>& y,
                         const Eigen::Ref<const Eigen::ArrayXd>& count) {
    const Problem problem = checked_problem(x, y, count);
    constexpr int most_steps = 200;
    LogisticFit fit;
    Eigen::VectorXd coefficient = Eigen::VectorXd::Zero(problem.design.cols());
    fit.loglik = problem.loglik(coefficient);
    for (bool last = false; !last; ++fit.steps) {
        const Slope slope = problem.slope(coefficient);
        const Eigen::LDLT<Eigen::MatrixXd> factor(slope.information);
        const Eigen::VectorXd step = factor.solve(slope.gradient);
        if (!step.allFinite() || problem.separates(coefficient) || problem.separates(step)) {
            throw DomainError(
                name, "separations of y by x", std::nullopt, std::nullopt, 1.0,
                "0: where some combination of the columns sorts the outcomes without error, no finite "
                "coefficients are best");
        }
        if (fit.steps >= most_steps) {
            throw DomainError(name, "steps", std::nullopt, std::nullopt, fit.steps,
                              "below 200 at the maximum");
        }
        // What the likelihood can still rise by is half the decrement. Near the maximum each step squares
        // what is left.
        const double rounding = 1e-12 * (1.0 + std::abs(fit.loglik));
        last = slope.gradient.dot(step) <= 1e-4 * rounding;
        double share = 1.0;
        Eigen::VectorXd next = coefficient + step;
        double risen = problem.loglik(next);
        while (!(risen >= fit.loglik - rounding) && share > 1e-10) {
            share /= 2.0;
            next = coefficient + share * step;
            risen = problem.loglik(next);
        }
        coefficient = next;
        fit.loglik = risen;
    }
    const Eigen::MatrixXd information = problem.slope(coefficient).information;
    const Eigen::MatrixXd identity = Eigen::MatrixXd::Identity(information.rows(), information.cols());
    const Eigen::MatrixXd covariance = Eigen::LDLT<Eigen::MatrixXd>(information).solve(identity);
    fit.coefficient = coefficient.array();
    fit.standard_error = covariance.diagonal().array().sqrt();
    return fit;
}

CoxCalibration cox_calibration(const Eigen::Ref<const Eigen::ArrayXd>& log_odds,
                               const Eigen::Ref<const Eigen::ArrayXi>& y,
                               const Eigen::Ref<const Eigen::ArrayXd>& count) {
    const LogisticFit fit = fit_logistic(log_odds, y, count);
    return {fit.coefficient(0), fit.standard_error(0), fit.coefficient(1), fit.standard_error(1), fit.loglik};
}

}  // namespace steelyard::engine
