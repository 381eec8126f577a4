// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/calibration.hpp"

#include <cmath>

#include "exact_sum.hpp"
#include "guards.hpp"
#include "score_root.hpp"
#include "steelyard/engine/distributions.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

double logistic(double x) {
    return x >= 0.0 ? 1.0 / (1.0 + std::exp(-x)) : std::exp(x) / (1.0 + std::exp(x));
}

IntervalEstimate wald(double value, double error, double z) {
    return {value, value - z * error, value + z * error};
}

/// Intercept and slope, or why there are none. Each pattern is a line for those with the cause and one for
/// the rest.
FitStatus fit_cox(const Eigen::ArrayXd& log_odds, const Eigen::ArrayXd& cases, const Eigen::ArrayXd& others,
                  std::optional<CoxCalibration>& cox) {
    const Eigen::Index lines = (cases > 0.0).count() + (others > 0.0).count();
    Eigen::ArrayXd x(lines), count(lines);
    Eigen::ArrayXi y(lines);
    Eigen::Index at = 0;
    for (Eigen::Index g = 0; g < log_odds.size(); ++g) {
        for (const int outcome : {1, 0}) {
            const double patients = outcome == 1 ? cases(g) : others(g);
            if (patients > 0.0) {
                x(at) = log_odds(g);
                y(at) = outcome;
                count(at) = patients;
                ++at;
            }
        }
    }
    try {
        cox = cox_calibration(x, y, count);
        return FitStatus::found;
    } catch (const DomainError& error) {
        if (error.argument() == "x columns") {
            return FitStatus::constant_forecast;
        }
        if (error.argument() == "separations of y by x") {
            return FitStatus::separated;
        }
        if (error.argument() == "steps") {
            return FitStatus::no_maximum_reached;
        }
        throw;
    }
}

std::optional<CalibrationTest> test_of(double sum, double variance) {
    if (!(variance > 0.0)) {
        return std::nullopt;
    }
    const double z = sum / std::sqrt(variance);
    return CalibrationTest{z, 2.0 * normal_upper(std::abs(z))};
}

}  // namespace

CauseCalibration cause_calibration(const AuditSample& sample, Eigen::Index cause, double level) {
    check_audit_sample("cause_calibration", sample);
    check_index("cause_calibration", "cause", cause, sample.causes());
    const double z = two_sided_normal_quantile(level);
    const Eigen::ArrayXd log_odds = log_odds_against_rest(sample, cause);
    const Eigen::ArrayXd cases = sample.count.col(cause);
    const Eigen::ArrayXd patients = sample.pattern_counts();
    const double n = patients.sum();
    CauseCalibration result;
    result.mean_forecast = (patients * sample.log_forecast.col(cause).exp()).sum() / n;
    result.observed_share = cases.sum() / n;
    const Eigen::ArrayXd others = (patients - cases).max(0.0);
    if (!(cases.sum() > 0.0)) {
        result.status = FitStatus::no_case;
        return result;
    }
    if (!(others.sum() > 0.0)) {
        result.status = FitStatus::only_cases;
        return result;
    }
    const auto at = [&](double shift) {
        ScoreAndInformation sum;
        for (Eigen::Index g = 0; g < log_odds.size(); ++g) {
            const double p = logistic(log_odds(g) + shift);
            const double q = logistic(-log_odds(g) - shift);
            sum.score += cases(g) * q - others(g) * p;
            sum.information += patients(g) * p * q;
        }
        return sum;
    };
    const double shift = root_of_score(at, 0.0);
    result.in_the_large_error = 1.0 / std::sqrt(at(shift).information);
    result.in_the_large = wald(shift, *result.in_the_large_error, z);
    result.status = fit_cox(log_odds, cases, others, result.cox);
    if (result.cox) {
        result.intercept = wald(result.cox->intercept, result.cox->intercept_error, z);
        result.slope = wald(result.cox->slope, result.cox->slope_error, z);
    }
    return result;
}

std::optional<CalibrationTest> spiegelhalter_test(const AuditSample& sample, Eigen::Index cause) {
    check_audit_sample("spiegelhalter_test", sample);
    check_index("spiegelhalter_test", "cause", cause, sample.causes());
    const Eigen::ArrayXd log_odds = log_odds_against_rest(sample, cause);
    ExactSum sum, variance;
    for (Eigen::Index g = 0; g < log_odds.size(); ++g) {
        const double p = logistic(log_odds(g));
        const double q = logistic(-log_odds(g));
        const double cases = sample.count(g, cause);
        const double patients = sample.count.row(g).sum();
        sum.add((q - p) * (cases * q - (patients - cases) * p));
        variance.add(patients * (q - p) * (q - p) * p * q);
    }
    return test_of(sum.value(), variance.value());
}

std::optional<CalibrationTest> spiegelhalter_test_all(const AuditSample& sample) {
    check_audit_sample("spiegelhalter_test_all", sample);
    ExactSum sum, variance;
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        const Eigen::ArrayXd p = sample.log_forecast.row(g).transpose().exp();
        const Eigen::ArrayXd count = sample.count.row(g).transpose();
        // A patient's score is 1 + sum p^2 - 2 p_y, so its distance from the mean is 2 (sum p^2 - p_y), and
        // sum p^2 is the mean of p_y.
        const Eigen::ArrayXd off = p - p.square().sum();
        sum.add(-2.0 * (count * off).sum());
        variance.add(4.0 * count.sum() * (p * off.square()).sum());
    }
    return test_of(sum.value(), variance.value());
}

std::optional<CalibrationTest> log_score_test(const AuditSample& sample) {
    check_audit_sample("log_score_test", sample);
    ExactSum sum, variance;
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        const Eigen::ArrayXd log_p = sample.log_forecast.row(g).transpose();
        const Eigen::ArrayXd p = log_p.exp();
        const Eigen::ArrayXd count = sample.count.row(g).transpose();
        const Eigen::ArrayXd off = log_p - (p * log_p).sum();
        sum.add(-(count * off).sum());
        variance.add(count.sum() * (p * off.square()).sum());
    }
    return test_of(sum.value(), variance.value());
}

}  // namespace steelyard::engine
