// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/audit_sample.hpp"

#include <cmath>
#include <limits>
#include <numbers>
#include <optional>
#include <string>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double tie = 1e-12;  // nats

}  // namespace

void check_audit_sample(std::string_view function, const AuditSample& sample) {
    check_size_at_least(function, "log_forecast rows", sample.log_forecast.rows(), 1);
    check_size_at_least(function, "log_forecast columns", sample.log_forecast.cols(), 2);
    check_size(function, "count rows", sample.count.rows(), sample.log_forecast.rows());
    check_size(function, "count columns", sample.count.cols(), sample.log_forecast.cols());
    check_all_between(function, "log_forecast", sample.log_forecast, -infinity, infinity);
    if (!(sample.count.isFinite().all() && sample.count.minCoeff() >= 0.0)) {
        check_all_between(function, "count", sample.count, 0.0, infinity);
    }
    Eigen::ArrayXd sum = Eigen::ArrayXd::Zero(sample.patterns());
    for (Eigen::Index k = 0; k < sample.causes(); ++k) {
        sum += sample.log_forecast.col(k).exp();
    }
    for (Eigen::Index g = 0; g < sum.size(); ++g) {
        if (!(std::abs(sum(g) - 1.0) <= 1e-9)) {
            throw DomainError(function, "log_forecast sum of exp", g, std::nullopt, sum(g), "1 within 1e-9");
        }
    }
    check_positive(function, "count sum", sample.count.sum());
}

Eigen::ArrayXd log_odds_against_rest(const AuditSample& sample, Eigen::Index cause) {
    check_index("log_odds_against_rest", "cause", cause, sample.causes());
    Eigen::ArrayXd log_odds(sample.patterns());
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        const double own = sample.log_forecast(g, cause);
        if (own <= -std::numbers::ln2) {
            log_odds(g) = own - std::log1p(-std::exp(own));
            continue;
        }
        double largest = -infinity;
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            largest = k == cause ? largest : std::max(largest, sample.log_forecast(g, k));
        }
        double others = 0.0;
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            others += k == cause ? 0.0 : std::exp(sample.log_forecast(g, k) - largest);
        }
        log_odds(g) = own - (largest + std::log(others));
    }
    return log_odds;
}

Eigen::ArrayXi leaders(const AuditSample& sample) {
    Eigen::ArrayXi leader(sample.patterns());
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        const double largest = sample.log_forecast.row(g).maxCoeff();
        int first = 0;
        while (sample.log_forecast(g, first) < largest - tie) {
            ++first;
        }
        leader(g) = first;
    }
    return leader;
}

}  // namespace steelyard::engine
