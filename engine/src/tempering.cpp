// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/tempering.hpp"

#include <cmath>
#include <limits>
#include <optional>
#include <string_view>

#include "guards.hpp"
#include "monotone_root.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr std::string_view name = "fit_tempering";

void check_evidence(const LabelledEvidence& evidence) {
    const Eigen::Index patients = evidence.loglik.rows();
    const Eigen::Index causes = evidence.loglik.cols();
    check_size_at_least(name, "evidence.loglik rows", patients, 1);
    check_size_at_least(name, "evidence.loglik columns", causes, 2);
    check_size(name, "evidence.log_prior", evidence.log_prior.size(), causes);
    check_size(name, "evidence.cause", evidence.cause.size(), patients);
    check_size(name, "evidence.count", evidence.count.size(), patients);
    check_all_between(name, "evidence.log_prior", evidence.log_prior, -infinity, infinity);
    check_all_between(name, "evidence.loglik", evidence.loglik, -infinity, infinity);
    check_all_positive(name, "evidence.count", evidence.count, infinity, "finite and > 0");
    for (Eigen::Index i = 0; i < patients; ++i) {
        if (evidence.cause(i) < 0 || evidence.cause(i) >= causes) {
            throw DomainError(name, "evidence.cause", i, std::nullopt, evidence.cause(i),
                              "a column of loglik");
        }
    }
}

/// The likelihood of the final causes and its first two derivatives in tau.
struct Likelihood {
    double value = 0.0;
    double slope = 0.0;
    double information = 0.0;
};

Likelihood likelihood(const LabelledEvidence& evidence, double tau) {
    Likelihood sum;
    for (Eigen::Index i = 0; i < evidence.loglik.rows(); ++i) {
        const Eigen::Index own = evidence.cause(i);
        // Taken from the patient's own cause, so that the terms that matter are not lost beside a common
        // constant.
        const Eigen::ArrayXd relative = evidence.loglik.row(i).transpose() - evidence.loglik(i, own);
        const Eigen::ArrayXd score = evidence.log_prior + tau * relative;
        const double largest = score.maxCoeff();
        const Eigen::ArrayXd share = (score - largest).exp();
        const double total = share.sum();
        const double mean = (share * relative).sum() / total;
        const double square = (share * (relative - mean).square()).sum() / total;
        sum.value += evidence.count(i) * (score(own) - largest - std::log(total));
        sum.slope -= evidence.count(i) * mean;
        sum.information += evidence.count(i) * square;
    }
    return sum;
}

/// No finite exponent is best when no patient has a cause that the evidence prefers to the true one.
void check_bounded(const LabelledEvidence& evidence) {
    bool flat = true;
    for (Eigen::Index i = 0; i < evidence.loglik.rows(); ++i) {
        const double own = evidence.loglik(i, evidence.cause(i));
        if (evidence.loglik.row(i).maxCoeff() > own) {
            return;
        }
        flat = flat && evidence.loglik.row(i).minCoeff() == own;
    }
    throw DomainError(name, "evidence", std::nullopt, std::nullopt, flat ? 0.0 : infinity,
                      flat ? "different for different causes"
                           : "wrong for at least one patient: where it never is, no finite exponent is best");
}

}  // namespace

TemperingFit fit_tempering(const LabelledEvidence& evidence) {
    check_evidence(evidence);
    check_bounded(evidence);
    const auto slope = [&](double tau) { return likelihood(evidence, tau).slope; };
    TemperingFit fit;
    fit.loglik_naive = likelihood(evidence, 1.0).value;
    if (slope(0.0) <= 0.0) {
        fit.tau = 0.0;
        fit.standard_error = infinity;
    } else {
        double high = 1.0;
        constexpr double farthest = 1e12;
        while (slope(high) > 0.0 && high < farthest) {
            high *= 2.0;
        }
        fit.tau = detail::root_between(slope, 0.0, high);
        fit.standard_error = 1.0 / std::sqrt(likelihood(evidence, fit.tau).information);
    }
    fit.loglik = likelihood(evidence, fit.tau).value;
    return fit;
}

}  // namespace steelyard::engine
