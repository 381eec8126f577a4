// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/probability.hpp"

#include <cmath>
#include <limits>
#include <optional>

#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {

Probability Probability::of(double value) {
    check_between("Probability::of", "value", value, 0.0, 1.0);
    return Probability(value);
}

LogOdds LogOdds::nats(double value) {
    if (std::isnan(value)) {
        throw DomainError("LogOdds::nats", "value", std::nullopt, std::nullopt, value,
                          "a number or an infinity");
    }
    return LogOdds(value);
}

LogOdds LogOdds::of(Probability probability) {
    const double p = probability.value();
    if (p == 0.0) {
        return LogOdds(-std::numeric_limits<double>::infinity());
    }
    if (p == 1.0) {
        return LogOdds(std::numeric_limits<double>::infinity());
    }
    // In the middle 2p - 1 is exact and atanh keeps the relative accuracy of a small log odds; p / (1 - p)
    // would not.
    if (p > 0.25 && p < 0.75) {
        return LogOdds(2.0 * std::atanh(2.0 * p - 1.0));
    }
    return LogOdds(std::log(p) - std::log1p(-p));
}

LogOdds LogOdds::of_odds(double odds) {
    check_between("LogOdds::of_odds", "odds", odds, 0.0, std::numeric_limits<double>::infinity());
    return LogOdds(std::log(odds));
}

Probability LogOdds::to_probability() const {
    if (nats_ >= 0.0) {
        return Probability::of(1.0 / (1.0 + std::exp(-nats_)));
    }
    const double odds = std::exp(nats_);
    return Probability::of(odds / (1.0 + odds));
}

double LogOdds::to_odds() const {
    return std::exp(nats_);
}

}  // namespace steelyard::engine
