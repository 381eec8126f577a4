// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/prior_range.hpp"

#include <algorithm>
#include <limits>
#include <numeric>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "exact_sum.hpp"
#include "guards.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double decimal_slack = 1e-9;

void check_limits(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& low,
                  const Eigen::Ref<const Eigen::ArrayXd>& high, double most) {
    check_size_at_least(function, "low", low.size(), 2);
    check_size(function, "high", high.size(), low.size());
    check_all_between(function, "low", low, 0.0, most);
    check_all_between(function, "high", high, 0.0, most);
    for (Eigen::Index k = 0; k < low.size(); ++k) {
        if (!(low(k) <= high(k))) {
            throw DomainError(function, "high", k, std::nullopt, high(k), "at least low");
        }
    }
}

void check_probability_limits(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& low,
                              const Eigen::Ref<const Eigen::ArrayXd>& high) {
    check_limits(function, low, high, 1.0);
    const double least = compensated_sum(low);
    const double greatest = compensated_sum(high);
    if (!(least <= 1.0 + decimal_slack)) {
        throw DomainError(function, "sum of low", std::nullopt, std::nullopt, least, "at most 1");
    }
    if (!(greatest >= 1.0 - decimal_slack)) {
        throw DomainError(function, "sum of high", std::nullopt, std::nullopt, greatest, "at least 1");
    }
}

void check_log_likelihood(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood,
                          Eigen::Index causes) {
    check_size(function, "log_likelihood", log_likelihood.size(), causes);
    check_all_between(function, "log_likelihood", log_likelihood, -infinity, infinity);
}

/// 1 - (the sum of all but k), rounded once.
double left_by_others(const Eigen::Ref<const Eigen::ArrayXd>& limit, Eigen::Index k) {
    ExactSum left(1.0);
    for (Eigen::Index j = 0; j < limit.size(); ++j) {
        if (j != k) {
            left.add(-limit(j));
        }
    }
    return left.value();
}

double rounding_of(Eigen::Index causes) {
    return static_cast<double>(causes) * std::numeric_limits<double>::epsilon();
}

/// What cause k can reach within the limits. What differs from a limit by rounding alone is that limit.
ProbabilityLimits reachable(const Eigen::Ref<const Eigen::ArrayXd>& low,
                            const Eigen::Ref<const Eigen::ArrayXd>& high) {
    const double rounding = rounding_of(low.size());
    ProbabilityLimits limits{low, high};
    for (Eigen::Index k = 0; k < low.size(); ++k) {
        const double at_least = left_by_others(high, k);
        const double at_most = left_by_others(low, k);
        if (at_least > low(k) + rounding) {
            limits.low(k) = at_least < high(k) - rounding ? at_least : high(k);
        }
        if (at_most < high(k) - rounding) {
            limits.high(k) = at_most > low(k) + rounding ? at_most : low(k);
        }
    }
    return limits;
}

/// Cause k at `own`; the others at their lower limits, then filled in the given order until the sum is 1.
Eigen::ArrayXd filled(const Eigen::Ref<const Eigen::ArrayXd>& low,
                      const Eigen::Ref<const Eigen::ArrayXd>& high, Eigen::Index k, double own,
                      const std::vector<Eigen::Index>& order) {
    Eigen::ArrayXd prior = low;
    prior(k) = own;
    ExactSum left(1.0);
    for (Eigen::Index j = 0; j < prior.size(); ++j) {
        left.add(-prior(j));
    }
    for (const Eigen::Index j : order) {
        if (j == k || left.value() <= rounding_of(low.size())) {
            continue;
        }
        const double added = std::min(left.value(), high(j) - low(j));
        prior(j) = added < high(j) - low(j) ? low(j) + added : high(j);
        left.add(-added);
    }
    return prior;
}

PosteriorRange empty_range(Eigen::Index causes) {
    return {Eigen::ArrayXd(causes), Eigen::ArrayXd(causes), Eigen::ArrayXXd(causes, causes),
            Eigen::ArrayXXd(causes, causes)};
}

/// The posteriors at the corners, once the corners stand.
void evaluate(PosteriorRange& range, const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood) {
    const Eigen::ArrayXd shifted = log_likelihood - log_likelihood.maxCoeff();
    for (Eigen::Index k = 0; k < shifted.size(); ++k) {
        range.low(k) = softmax(range.low_at.col(k).log() + shifted)(k);
        range.high(k) = softmax(range.high_at.col(k).log() + shifted)(k);
    }
}

}  // namespace

ProbabilityLimits tightened(const Eigen::Ref<const Eigen::ArrayXd>& low,
                            const Eigen::Ref<const Eigen::ArrayXd>& high) {
    check_probability_limits("tightened", low, high);
    return reachable(low, high);
}

PosteriorRange range_of_probabilities(const Eigen::Ref<const Eigen::ArrayXd>& low,
                                      const Eigen::Ref<const Eigen::ArrayXd>& high,
                                      const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood) {
    check_probability_limits("range_of_probabilities", low, high);
    check_log_likelihood("range_of_probabilities", log_likelihood, low.size());
    const ProbabilityLimits limits = reachable(low, high);
    std::vector<Eigen::Index> rising(static_cast<std::size_t>(low.size()));
    std::iota(rising.begin(), rising.end(), Eigen::Index{0});
    std::stable_sort(rising.begin(), rising.end(), [&](Eigen::Index left, Eigen::Index right) {
        return log_likelihood(left) < log_likelihood(right);
    });
    const std::vector<Eigen::Index> sinking(rising.rbegin(), rising.rend());
    PosteriorRange range = empty_range(low.size());
    for (Eigen::Index k = 0; k < low.size(); ++k) {
        range.low_at.col(k) = filled(low, high, k, limits.low(k), sinking);
        range.high_at.col(k) = filled(low, high, k, limits.high(k), rising);
    }
    evaluate(range, log_likelihood);
    return range;
}

PosteriorRange range_of_weights(const Eigen::Ref<const Eigen::ArrayXd>& low,
                                const Eigen::Ref<const Eigen::ArrayXd>& high,
                                const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood) {
    check_limits("range_of_weights", low, high, infinity);
    check_all_positive("range_of_weights", "high", high, infinity, "finite and > 0");
    check_log_likelihood("range_of_weights", log_likelihood, low.size());
    PosteriorRange range = empty_range(low.size());
    for (Eigen::Index k = 0; k < low.size(); ++k) {
        range.low_at.col(k) = high;
        range.low_at(k, k) = low(k);
        range.high_at.col(k) = low;
        range.high_at(k, k) = high(k);
    }
    evaluate(range, log_likelihood);
    return range;
}

PosteriorRange range_of_contamination(const Eigen::Ref<const Eigen::ArrayXd>& log_prior, double epsilon,
                                      const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood) {
    constexpr std::string_view name = "range_of_contamination";
    check_size_at_least(name, "log_prior", log_prior.size(), 2);
    check_all_between(name, "log_prior", log_prior, -infinity, infinity);
    check_between(name, "epsilon", epsilon, 0.0, 1.0);
    check_log_likelihood(name, log_likelihood, log_prior.size());
    const Eigen::ArrayXd kept = (1.0 - epsilon) * softmax(log_prior);
    PosteriorRange range = empty_range(log_prior.size());
    for (Eigen::Index k = 0; k < log_prior.size(); ++k) {
        Eigen::ArrayXd others = log_likelihood;
        others(k) = -infinity;
        Eigen::Index likeliest = 0;
        others.maxCoeff(&likeliest);
        range.low_at.col(k) = kept;
        range.low_at(likeliest, k) += epsilon;
        range.high_at.col(k) = kept;
        range.high_at(k, k) += epsilon;
    }
    evaluate(range, log_likelihood);
    return range;
}

}  // namespace steelyard::engine
