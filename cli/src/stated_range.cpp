// SPDX-License-Identifier: Apache-2.0
// From the ranges that a prior set states to the ranges of the posteriors.
#include <algorithm>
#include <cmath>

#include "sensitivity_parts.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::cli {
namespace {

/// Weights move free of each other; a cause without a range keeps its weight.
StatedRange range_over_weights(const CaseModel& model, const priors::PriorSet& priors,
                               const Eigen::ArrayXd& log_likelihood) {
    const auto causes = static_cast<Eigen::Index>(model.causes().size());
    Eigen::ArrayXd low(causes);
    Eigen::ArrayXd high(causes);
    for (Eigen::Index k = 0; k < causes; ++k) {
        const priors::PriorCause& cause = *priors.find(model.causes()[static_cast<std::size_t>(k)]);
        low(k) = cause.range_low.value_or(cause.given);
        high(k) = cause.range_high.value_or(cause.given);
    }
    return {cause_ranges(engine::range_of_weights(low, high, log_likelihood)), false};
}

/// Odds against the rest are probabilities that add up to 1. Causes without a range take up what the others
/// leave, in proportion to each other: together they are one cause of any prior, whose likelihood is theirs
/// weighed by their priors.
StatedRange range_over_odds(const CaseModel& model, const priors::PriorSet& priors,
                            const Eigen::ArrayXd& log_likelihood) {
    std::vector<double> low;
    std::vector<double> high;
    std::vector<double> loglik;
    std::vector<Eigen::Index> place;  // of each cause among the limits
    std::vector<Eigen::Index> free;
    for (Eigen::Index k = 0; k < log_likelihood.size(); ++k) {
        const priors::PriorCause& cause = *priors.find(model.causes()[static_cast<std::size_t>(k)]);
        place.push_back(static_cast<Eigen::Index>(low.size()));
        if (!cause.range_low || !cause.range_high) {
            free.push_back(k);
            continue;
        }
        const auto probability = [&](double odds) { return odds / (1.0 + odds) / priors.given_sum; };
        low.push_back(std::min(probability(*cause.range_low), cause.probability));
        high.push_back(std::clamp(probability(*cause.range_high), cause.probability, 1.0));
        loglik.push_back(log_likelihood(k));
    }
    Eigen::ArrayXd share(static_cast<Eigen::Index>(free.size()));  // ln of prior times likelihood
    for (std::size_t i = 0; i < free.size(); ++i) {
        place[static_cast<std::size_t>(free[i])] = static_cast<Eigen::Index>(low.size());
        share(static_cast<Eigen::Index>(i)) = model.log_prior()(free[i]) + log_likelihood(free[i]);
    }
    if (!free.empty()) {
        Eigen::ArrayXd prior(share.size());
        for (std::size_t i = 0; i < free.size(); ++i) {
            prior(static_cast<Eigen::Index>(i)) = model.log_prior()(free[i]);
        }
        low.push_back(0.0);
        high.push_back(1.0);
        loglik.push_back(engine::log_sum_exp(share) - engine::log_sum_exp(prior));
    }
    const auto as_array = [](const std::vector<double>& values) {
        return Eigen::ArrayXd(
            Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size())));
    };
    const Eigen::ArrayXd lows = as_array(low);
    const Eigen::ArrayXd highs = as_array(high);
    const engine::PosteriorRange range = engine::range_of_probabilities(lows, highs, as_array(loglik));
    const engine::ProbabilityLimits reached = engine::tightened(lows, highs);
    StatedRange result;
    for (Eigen::Index k = 0; k < log_likelihood.size(); ++k) {
        const Eigen::Index at = place[static_cast<std::size_t>(k)];
        const auto own = std::find(free.begin(), free.end(), k);
        const double part =
            own == free.end() ? 1.0 : std::exp(share(own - free.begin()) - engine::log_sum_exp(share));
        result.range.push_back({static_cast<std::size_t>(k), range.low(at) * part, range.high(at) * part});
        constexpr double told = 1e-6;
        result.narrowed =
            result.narrowed ||
            (own == free.end() && (reached.low(at) > lows(at) + told || reached.high(at) < highs(at) - told));
    }
    return result;
}

}  // namespace

std::vector<CauseRange> cause_ranges(const engine::PosteriorRange& range) {
    std::vector<CauseRange> list;
    for (Eigen::Index k = 0; k < range.low.size(); ++k) {
        list.push_back({static_cast<std::size_t>(k), range.low(k), range.high(k)});
    }
    return list;
}

/// stated.
StatedRange stated_range(const CaseModel& model, const priors::PriorSet& priors,
                         const Eigen::ArrayXd& log_likelihood) {
    const bool any = std::any_of(model.causes().begin(), model.causes().end(), [&](const std::string& id) {
        return priors.find(id)->range_low.has_value();
    });
    if (!any) {
        return {};
    }
    return priors.given_as == priors::GivenAs::odds_against_rest
               ? range_over_odds(model, priors, log_likelihood)
               : range_over_weights(model, priors, log_likelihood);
}

}  // namespace steelyard::cli
