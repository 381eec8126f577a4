// SPDX-License-Identifier: Apache-2.0
#include "one_against_others.hpp"

#include <cmath>
#include <limits>
#include <optional>

#include "guards.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {

OneAgainstOthers one_against_others(std::string_view function,
                                    const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                    const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, Eigen::Index one,
                                    std::string_view argument) {
    constexpr double infinity = std::numeric_limits<double>::infinity();
    check_size_at_least(function, "log_prior", log_prior.size(), 2);
    check_size(function, "log_likelihood", log_likelihood.size(), log_prior.size());
    check_all_between(function, "log_prior", log_prior, -infinity, infinity);
    check_all_between(function, "log_likelihood", log_likelihood, -infinity, infinity);
    check_index(function, argument, one, log_prior.size());
    // Differences to the one before anything is added: shared constants cancel exactly.
    Eigen::ArrayXd prior = log_prior - log_prior(one);
    Eigen::ArrayXd score = prior + (log_likelihood - log_likelihood(one));
    for (Eigen::Index k = 0; k < score.size(); ++k) {
        if (!std::isfinite(score(k))) {
            throw DomainError(function, "score", k, std::nullopt, score(k), "finite: the sum overflows");
        }
    }
    prior(one) = -infinity;
    score(one) = -infinity;
    const double prior_of_others = log_sum_exp(prior);
    // Below the largest, so that the shares sum to 1 to the last digits however far off the one is.
    const double largest = score.maxCoeff();
    const Eigen::ArrayXd below = score - largest;
    const double rest = log_sum_exp(below);
    return {-prior_of_others, prior_of_others - (largest + rest), below - rest};
}

}  // namespace steelyard::engine
