// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/recalibration.hpp"

#include <Eigen/Cholesky>
#include <Eigen/QR>
#include <algorithm>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>

#include "guards.hpp"
#include "score_root.hpp"
#include "steelyard/engine/boost_policy.hpp"

namespace steelyard::engine {
namespace {

/// A multinomial regression with the reference cause first: eta_k = offset_k + sum_d theta_kd z_d.
struct Problem {
    Eigen::MatrixXd design;   // shape (G, D): z
    Eigen::MatrixXd offset;   // shape (G, K - 1)
    Eigen::MatrixXd outcome;  // shape (G, K - 1): patients of the other causes
    Eigen::VectorXd total;    // shape (G): patients

    Eigen::Index rest() const { return offset.cols(); }
    Eigen::Index terms() const { return design.cols(); }
    Eigen::Index size() const { return rest() * terms(); }

    /// Row g of eta for coefficients laid out cause after cause.
    Eigen::VectorXd eta(const Eigen::VectorXd& theta, Eigen::Index g) const {
        const Eigen::Map<const Eigen::MatrixXd> by_cause(theta.data(), terms(), rest());
        return by_cause.transpose() * design.row(g).transpose();
    }
};

struct Fit {
    FitStatus status = FitStatus::found;
    Eigen::VectorXd theta, error;
    double loglik = 0.0;
};

/// ln of 1 + sum e^eta.
double log_total(const Eigen::VectorXd& eta) {
    const double largest = std::max(0.0, eta.maxCoeff());
    return largest + std::log(std::exp(-largest) + (eta.array() - largest).exp().sum());
}

double loglik(const Problem& problem, const Eigen::VectorXd& theta) {
    double sum = 0.0;
    for (Eigen::Index g = 0; g < problem.total.size(); ++g) {
        if (problem.total(g) > 0.0) {
            const Eigen::VectorXd eta = problem.eta(theta, g) + problem.offset.row(g).transpose();
            sum += problem.outcome.row(g).dot(eta) - problem.total(g) * log_total(eta);
        }
    }
    return sum;
}

struct Derivatives {
    Eigen::VectorXd gradient;
    Eigen::MatrixXd information;
};

Derivatives derivatives(const Problem& problem, const Eigen::VectorXd& theta) {
    const Eigen::Index terms = problem.terms();
    Derivatives sum{Eigen::VectorXd::Zero(problem.size()),
                    Eigen::MatrixXd::Zero(problem.size(), problem.size())};
    for (Eigen::Index g = 0; g < problem.total.size(); ++g) {
        if (!(problem.total(g) > 0.0)) {
            continue;
        }
        const Eigen::VectorXd eta = problem.eta(theta, g) + problem.offset.row(g).transpose();
        const Eigen::VectorXd p = (eta.array() - log_total(eta)).exp();
        const Eigen::VectorXd z = problem.design.row(g).transpose();
        const Eigen::MatrixXd zz = z * z.transpose();
        for (Eigen::Index k = 0; k < problem.rest(); ++k) {
            sum.gradient.segment(k * terms, terms) += (problem.outcome(g, k) - problem.total(g) * p(k)) * z;
            for (Eigen::Index l = 0; l <= k; ++l) {
                const double curvature = problem.total(g) * p(k) * ((k == l ? 1.0 : 0.0) - p(l));
                sum.information.block(k * terms, l * terms, terms, terms) += curvature * zz;
            }
        }
    }
    sum.information.triangularView<Eigen::StrictlyUpper>() = sum.information.transpose();
    return sum;
}

/// Whether going along `direction` for ever makes no final cause less likely and some more (Albert and
/// Anderson, Biometrika 1984;71:1).
bool separates(const Problem& problem, const Eigen::VectorXd& direction) {
    double least = 0.0;
    double largest = 0.0;
    for (Eigen::Index g = 0; g < problem.total.size(); ++g) {
        Eigen::VectorXd eta(problem.rest() + 1);
        eta << 0.0, problem.eta(direction, g);
        const double of_reference = problem.total(g) - problem.outcome.row(g).sum();
        for (Eigen::Index k = 0; k < eta.size(); ++k) {
            const bool present =
                k == 0 ? of_reference > 1e-9 * problem.total(g) : problem.outcome(g, k - 1) > 0.0;
            if (present) {
                least = std::min(least, eta(k) - eta.maxCoeff());
                largest = std::max(largest, eta(k) - eta.minCoeff());
            }
        }
    }
    largest = std::max(largest, -least);
    return largest > 0.0 && least >= -1e-9 * largest;
}

Fit maximise(const Problem& problem, Eigen::VectorXd theta) {
    Fit fit;
    fit.loglik = loglik(problem, theta);
    bool last = false;
    for (int steps = 0; !last; ++steps) {
        const Derivatives here = derivatives(problem, theta);
        const Eigen::VectorXd step = Eigen::LDLT<Eigen::MatrixXd>(here.information).solve(here.gradient);
        if (!step.allFinite() || separates(problem, theta) || separates(problem, step)) {
            fit.status = FitStatus::separated;
            return fit;
        }
        if (steps >= 200) {
            fit.status = FitStatus::no_maximum_reached;
            return fit;
        }
        const double rounding = 1e-12 * (1.0 + std::abs(fit.loglik));
        last = here.gradient.dot(step) <= 1e-4 * rounding;
        double share = 1.0;
        Eigen::VectorXd next = theta + step;
        double risen = loglik(problem, next);
        while (!(risen >= fit.loglik - rounding) && share > 1e-10) {
            share /= 2.0;
            next = theta + share * step;
            risen = loglik(problem, next);
        }
        theta = next;
        fit.loglik = risen;
    }
    const Eigen::MatrixXd identity = Eigen::MatrixXd::Identity(problem.size(), problem.size());
    const Eigen::MatrixXd covariance =
        Eigen::LDLT<Eigen::MatrixXd>(derivatives(problem, theta).information).solve(identity);
    fit.theta = theta;
    fit.error = covariance.diagonal().array().sqrt();
    return fit;
}

/// Whether the columns, brought to one length, are independent where there are patients.
bool has_full_rank(const Problem& problem) {
    Eigen::MatrixXd scaled = problem.design;
    for (Eigen::Index g = 0; g < scaled.rows(); ++g) {
        scaled.row(g) *= problem.total(g) > 0.0 ? 1.0 : 0.0;
    }
    for (Eigen::Index d = 0; d < scaled.cols(); ++d) {
        const double length = scaled.col(d).stableNorm();
        scaled.col(d) /= length > 0.0 ? length : 1.0;
    }
    Eigen::ColPivHouseholderQR<Eigen::MatrixXd> qr(scaled);
    qr.setThreshold(1e-11);
    return qr.rank() == scaled.cols();
}

LikelihoodRatioTest ratio_test(double higher, double lower, Eigen::Index degrees) {
    const double chi2 = std::max(0.0, 2.0 * (higher - lower));
    const double p = boost::math::gamma_q(0.5 * static_cast<double>(degrees), 0.5 * chi2, BoostPolicy());
    return {chi2, degrees, p};
}

}  // namespace

Recalibration recalibrate(const AuditSample& sample, Eigen::Index reference) {
    check_audit_sample("recalibrate", sample);
    check_index("recalibrate", "reference", reference, sample.causes());
    const Eigen::Index rest = sample.causes() - 1;
    Recalibration result;
    result.reference = reference;
    result.forecast_loglik = (sample.count * sample.log_forecast).sum();
    if (!(sample.cause_counts() > 0.0).all()) {
        result.status = result.intercepts_status = FitStatus::no_case;
        return result;
    }
    Problem problem;
    problem.offset.resize(sample.patterns(), rest);
    problem.outcome.resize(sample.patterns(), rest);
    for (Eigen::Index k = 0; k < rest; ++k) {
        const Eigen::Index cause = k < reference ? k : k + 1;
        problem.offset.col(k) =
            (sample.log_forecast.col(cause) - sample.log_forecast.col(reference)).matrix();
        problem.outcome.col(k) = sample.count.col(cause).matrix();
    }
    problem.total = sample.pattern_counts().matrix();
    problem.design = Eigen::MatrixXd::Ones(sample.patterns(), 1);
    const Fit intercepts = maximise(problem, Eigen::VectorXd::Zero(rest));
    result.intercepts_status = intercepts.status;
    if (intercepts.status == FitStatus::found) {
        result.intercept = intercepts.theta.array();
        result.intercept_error = intercepts.error.array();
        result.intercepts_loglik = intercepts.loglik;
        result.intercepts_against_none = ratio_test(intercepts.loglik, result.forecast_loglik, rest);
    }
    if (sample.causes() > most_recalibrated_causes) {
        result.status = FitStatus::too_many_causes;
        return result;
    }
    problem.design.resize(sample.patterns(), rest + 1);
    problem.design.col(0).setOnes();
    problem.design.rightCols(rest) = problem.offset;
    problem.offset.setZero();
    if (!has_full_rank(problem)) {
        result.status = FitStatus::constant_forecast;
        return result;
    }
    Eigen::VectorXd start = Eigen::VectorXd::Zero(problem.size());
    for (Eigen::Index k = 0; k < rest; ++k) {
        start(k * (rest + 1) + 1 + k) = 1.0;  // the forecasts as they are
    }
    const Fit full = maximise(problem, start);
    result.status = full.status;
    if (full.status == FitStatus::found) {
        const auto laid_out = [&](const Eigen::VectorXd& theta) {
            return Eigen::ArrayXXd(
                Eigen::Map<const Eigen::ArrayXXd>(theta.data(), rest + 1, rest).transpose());
        };
        result.coefficient = laid_out(full.theta);
        result.standard_error = laid_out(full.error);
        result.loglik = full.loglik;
        result.full_against_none = ratio_test(full.loglik, result.forecast_loglik, rest * (rest + 1));
        if (intercepts.status == FitStatus::found) {
            result.full_against_intercepts = ratio_test(full.loglik, intercepts.loglik, rest * rest);
        }
    }
    return result;
}

TemperatureFit temperature(const AuditSample& sample, double level) {
    check_audit_sample("temperature", sample);
    const double z = two_sided_normal_quantile(level);
    constexpr double tie = 1e-12;  // nats
    bool flat = true;
    bool wrong = false;
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        const double largest = sample.log_forecast.row(g).maxCoeff();
        if (sample.count.row(g).sum() > 0.0) {
            flat = flat && sample.log_forecast.row(g).minCoeff() >= largest - tie;
        }
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            wrong = wrong || (sample.count(g, k) > 0.0 && sample.log_forecast(g, k) < largest - tie);
        }
    }
    TemperatureFit result;
    if (flat || !wrong) {
        result.status = flat ? FitStatus::constant_forecast : FitStatus::separated;
        return result;
    }
    const auto at = [&](double exponent) {
        ScoreAndInformation sum;
        result.loglik = 0.0;
        for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
            const Eigen::ArrayXd count = sample.count.row(g).transpose();
            const double patients = count.sum();
            if (patients > 0.0) {
                // From the largest, so that what differs is not lost beside what is common.
                Eigen::ArrayXd relative = sample.log_forecast.row(g).transpose();
                relative -= relative.maxCoeff();
                Eigen::ArrayXd p = (exponent * relative).exp();
                const double total = p.sum();
                p /= total;
                const double mean = (p * relative).sum();
                const double own = (count * relative).sum();
                sum.score += own - patients * mean;
                sum.information += patients * (p * (relative - mean).square()).sum();
                result.loglik += exponent * own - patients * std::log(total);
            }
        }
        return sum;
    };
    const ScoreAndInformation at_zero = at(0.0);
    if (at_zero.score <= 0.0) {
        const double beyond = at_zero.score / at_zero.information;
        result.exponent = {0.0, 0.0, std::max(0.0, beyond + z / std::sqrt(at_zero.information))};
        return result;
    }
    const double exponent = root_of_score(at, 1.0);
    const double error = 1.0 / std::sqrt(at(exponent).information);
    result.exponent = {exponent, std::max(0.0, exponent - z * error), exponent + z * error};
    result.standard_error = error;
    return result;
}

}  // namespace steelyard::engine
