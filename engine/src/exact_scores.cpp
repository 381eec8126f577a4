// SPDX-License-Identifier: Apache-2.0
#include "exact_scores.hpp"

#include <cmath>
#include <limits>
#include <optional>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

void check_arguments(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                     const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                     const Eigen::Ref<const Eigen::ArrayXd>& weight) {
    check_size_at_least(function, "log_prior", log_prior.size(), 2);
    check_size(function, "loglik columns", loglik.cols(), log_prior.size());
    check_size(function, "weight", weight.size(), loglik.rows());
    check_all_between(function, "log_prior", log_prior, -infinity, infinity);
    for (Eigen::Index cause = 0; cause < loglik.cols(); ++cause) {
        for (Eigen::Index finding = 0; finding < loglik.rows(); ++finding) {
            const double value = loglik(finding, cause);
            if (!(std::isfinite(value) && value <= 0.0)) {
                throw DomainError(function, "loglik", finding, cause, value, "finite and <= 0");
            }
        }
    }
    check_all_positive(function, "weight", weight, 1.0, "> 0 and <= 1");
}

}  // namespace

Eigen::ArrayXd ExactScores::below_leader() const {
    Eigen::ArrayXd difference(static_cast<Eigen::Index>(score.size()));
    for (std::size_t k = 0; k < score.size(); ++k) {
        difference(static_cast<Eigen::Index>(k)) = score[k].minus(score[leader]);
    }
    return difference;
}

ExactScores exact_scores(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                         const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
                         const Eigen::Ref<const Eigen::ArrayXd>& weight) {
    check_arguments(function, log_prior, loglik, weight);
    ExactScores scores;
    scores.score.reserve(static_cast<std::size_t>(log_prior.size()));
    for (Eigen::Index cause = 0; cause < log_prior.size(); ++cause) {
        ExactSum score(log_prior(cause));
        for (Eigen::Index finding = 0; finding < loglik.rows(); ++finding) {
            if (weight(finding) == 1.0) {
                score.add(loglik(finding, cause));
            } else {
                score.add_product(weight(finding), loglik(finding, cause));
            }
        }
        if (!std::isfinite(score.value())) {
            throw DomainError(function, "score", cause, std::nullopt, score.value(),
                              "finite: the sum overflows");
        }
        scores.score.push_back(score);
        if (score.minus(scores.score[scores.leader]) > 0.0) {
            scores.leader = scores.score.size() - 1;
        }
    }
    for (Eigen::Index cause = 0; cause < log_prior.size(); ++cause) {
        const double difference =
            scores.score[static_cast<std::size_t>(cause)].minus(scores.score[scores.leader]);
        if (!std::isfinite(difference)) {
            throw DomainError(function, "score", cause, std::nullopt, difference,
                              "finite: the sum overflows");
        }
    }
    return scores;
}

}  // namespace steelyard::engine
