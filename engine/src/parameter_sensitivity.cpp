// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/parameter_sensitivity.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <string_view>

#include "guards.hpp"
#include "one_against_others.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

void check_inside(std::string_view function, std::string_view argument, double value) {
    if (!(value > 0.0 && value < 1.0)) {
        throw DomainError(function, argument, std::nullopt, std::nullopt, value, "> 0 and < 1");
    }
}

/// factor * log_x, where a factor of 0 takes no part even at x = 0.
double part(double factor, double log_x) {
    return factor == 0.0 ? 0.0 : factor * log_x;
}

LogOdds owner_odds(const SensitivityCurve& curve, double theta) {
    return LogOdds::nats(curve.start + part(curve.rise, std::log(theta)) +
                         part(curve.fall, std::log1p(-theta)));
}

SensitivityCurve cell_curve(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                            const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex cause,
                            double cell, double weight) {
    const OneAgainstOthers parts = one_against_others(function, log_prior, log_likelihood, cause.value);
    check_inside(function, "cell", cell);
    if (!(weight > 0.0 && weight <= 1.0)) {
        throw DomainError(function, "weight", std::nullopt, std::nullopt, weight, "> 0 and <= 1");
    }
    return {cause, cell, parts.log_posterior_odds(), 0.0, 0.0, parts.log_share};
}

void check_beliefs(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& log_p,
                   const Eigen::Ref<const Eigen::ArrayXd>& log_q) {
    check_size_at_least(function, "log_p", log_p.size(), 1);
    check_size(function, "log_q", log_q.size(), log_p.size());
    check_all_between(function, "log_p", log_p, -infinity, infinity);
    check_all_between(function, "log_q", log_q, -infinity, infinity);
}

}  // namespace

Eigen::ArrayXd SensitivityCurve::posterior(double theta) const {
    check_between("SensitivityCurve::posterior", "theta", theta, 0.0, 1.0);
    const LogOdds odds = owner_odds(*this, theta);
    Eigen::ArrayXd probability = odds.complement().to_probability().value() * log_share.exp();
    probability(owner.value) = odds.to_probability().value();
    return probability;
}

Eigen::ArrayXd SensitivityCurve::derivative(double theta) const {
    check_inside("SensitivityCurve::derivative", "theta", theta);
    const LogOdds odds = owner_odds(*this, theta);
    const double own = odds.to_probability().value() * odds.complement().to_probability().value() *
                       (rise / theta - fall / (1.0 - theta));
    Eigen::ArrayXd slope = -own * log_share.exp();
    slope(owner.value) = own;
    return slope;
}

std::optional<double> SensitivityCurve::tie(CauseIndex a, CauseIndex b) const {
    check_index("SensitivityCurve::tie", "a", a.value, log_share.size());
    check_index("SensitivityCurve::tie", "b", b.value, log_share.size());
    if (a == b) {
        throw DomainError("SensitivityCurve::tie", "b", std::nullopt, std::nullopt,
                          static_cast<double>(b.value), "another cause than a");
    }
    if (a != owner && b != owner) {
        return std::nullopt;
    }
    // The owner ties with k when its odds against all others are k's part of the others.
    const double needed = log_share(a == owner ? b.value : a.value) - start;
    if (rise > 0.0 && fall < 0.0) {
        return LogOdds::nats(needed).to_probability().value();
    }
    const double log_cell = needed / (rise > 0.0 ? rise : fall);
    if (log_cell > 0.0) {
        return std::nullopt;
    }
    return rise > 0.0 ? std::exp(log_cell) : -std::expm1(log_cell);
}

SensitivityCurve prior_curve(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                             const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex cause) {
    const OneAgainstOthers parts = one_against_others("prior_curve", log_prior, log_likelihood, cause.value);
    const double current = LogOdds::nats(parts.log_prior_odds).to_probability().value();
    check_inside("prior_curve", "prior", current);
    return {cause, current, parts.log_bayes, 1.0, -1.0, parts.log_share};
}

SensitivityCurve seen_cell_curve(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                 const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex cause,
                                 double cell, double weight) {
    SensitivityCurve curve = cell_curve("seen_cell_curve", log_prior, log_likelihood, cause, cell, weight);
    curve.rise = weight;
    curve.start -= weight * std::log(cell);
    return curve;
}

SensitivityCurve other_cell_curve(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                  const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex cause,
                                  double cell, double weight) {
    SensitivityCurve curve = cell_curve("other_cell_curve", log_prior, log_likelihood, cause, cell, weight);
    curve.fall = weight;
    curve.start -= weight * std::log1p(-cell);
    return curve;
}

double Swing::width() const {
    return std::abs(at_high - at_low);
}

Swing swing(const SensitivityCurve& curve, double low, double high, CauseIndex target) {
    check_index("swing", "target", target.value, curve.log_share.size());
    check_between("swing", "low", low, 0.0, 1.0);
    check_between("swing", "high", high, low, 1.0);
    return {curve.posterior(low)(target.value), curve.posterior(high)(target.value)};
}

std::vector<std::size_t> tornado_order(const std::vector<Swing>& bars) {
    std::vector<std::size_t> order(bars.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(), [&bars](std::size_t left, std::size_t right) {
        return bars[left].width() > bars[right].width();
    });
    return order;
}

double belief_distance(const Eigen::Ref<const Eigen::ArrayXd>& log_p,
                       const Eigen::Ref<const Eigen::ArrayXd>& log_q) {
    check_beliefs("belief_distance", log_p, log_q);
    const Eigen::ArrayXd change = log_q - log_p;
    const double distance = change.maxCoeff() - change.minCoeff();
    if (!std::isfinite(distance)) {
        throw DomainError("belief_distance", "distance", std::nullopt, std::nullopt, distance,
                          "finite: the difference overflows");
    }
    return distance;
}

BeliefBounds belief_bounds(Probability before, double distance) {
    check_between("belief_bounds", "distance", distance, 0.0, infinity);
    const double odds = LogOdds::of(before).to_nats();
    return {LogOdds::nats(odds - distance).to_probability(), LogOdds::nats(odds + distance).to_probability()};
}

double relative_entropy(const Eigen::Ref<const Eigen::ArrayXd>& log_p,
                        const Eigen::Ref<const Eigen::ArrayXd>& log_q) {
    check_beliefs("relative_entropy", log_p, log_q);
    const Eigen::ArrayXd p = log_p - log_sum_exp(log_p);
    const Eigen::ArrayXd q = log_q - log_sum_exp(log_q);
    return std::max(0.0, compensated_sum(p.exp() * (p - q)));
}

}  // namespace steelyard::engine
