// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/prior_sensitivity.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>
#include <string_view>

#include "guards.hpp"
#include "one_against_others.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

void check_inside(std::string_view function, std::string_view argument, std::optional<Eigen::Index> place,
                  double value) {
    if (!(value > 0.0 && value < 1.0)) {
        throw DomainError(function, argument, place, std::nullopt, value, "> 0 and < 1");
    }
}

/// ln of the probability with these log odds: -ln(1 + e^-x) without overflow.
double log_probability(double log_odds) {
    return std::min(log_odds, 0.0) - std::log1p(std::exp(-std::abs(log_odds)));
}

Eigen::ArrayXd moved(const OneAgainstOthers& parts, Eigen::Index cause, double log_odds) {
    Eigen::ArrayXd log_prior = log_probability(-log_odds) + parts.log_share;
    log_prior(cause) = log_probability(log_odds);
    return log_prior;
}

}  // namespace

Eigen::ArrayXd with_prior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior, CauseIndex cause, LogOdds odds) {
    // Before any evidence, the others' part in the posterior is their part in the prior.
    const OneAgainstOthers parts =
        one_against_others("with_prior", log_prior, Eigen::ArrayXd::Zero(log_prior.size()), cause.value);
    check_between("with_prior", "odds", odds.to_nats(), -std::numeric_limits<double>::infinity(),
                  std::numeric_limits<double>::infinity());
    return moved(parts, cause.value, odds.to_nats());
}

Eigen::ArrayXd with_prior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior, CauseIndex cause,
                          Probability probability) {
    check_inside("with_prior", "probability", std::nullopt, probability.value());
    return with_prior(log_prior, cause, LogOdds::of(probability));
}

TippingPrior tipping_prior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                           const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex leader,
                           CauseIndex rival) {
    const OneAgainstOthers parts =
        one_against_others("tipping_prior", log_prior, log_likelihood, rival.value, "rival");
    check_index("tipping_prior", "leader", leader.value, log_prior.size());
    if (leader == rival) {
        throw DomainError("tipping_prior", "leader", std::nullopt, std::nullopt,
                          static_cast<double>(leader.value), "another cause than the rival");
    }
    const double leader_to_rival = (log_prior(leader.value) - log_prior(rival.value)) +
                                   (log_likelihood(leader.value) - log_likelihood(rival.value));
    return {LogOdds::nats(leader_to_rival + parts.log_prior_odds), LogWeight::nats(leader_to_rival)};
}

LogOdds prior_for_posterior(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                            const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex cause,
                            Probability target) {
    const OneAgainstOthers parts =
        one_against_others("prior_for_posterior", log_prior, log_likelihood, cause.value);
    check_inside("prior_for_posterior", "target", std::nullopt, target.value());
    return LogOdds::nats(LogOdds::of(target).to_nats() - parts.log_bayes);
}

Eigen::ArrayXXd prior_sweep(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                            const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood, CauseIndex cause,
                            const Eigen::Ref<const Eigen::ArrayXd>& priors) {
    const OneAgainstOthers parts = one_against_others("prior_sweep", log_prior, log_likelihood, cause.value);
    Eigen::ArrayXXd posterior(log_prior.size(), priors.size());
    for (Eigen::Index g = 0; g < priors.size(); ++g) {
        check_inside("prior_sweep", "priors", g, priors(g));
        const double odds = LogOdds::of(Probability::of(priors(g))).to_nats() + parts.log_bayes;
        posterior.col(g) = moved(parts, cause.value, odds).exp();
    }
    return posterior;
}

Eigen::ArrayXXd prior_derivative(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
                                 const Eigen::Ref<const Eigen::ArrayXd>& log_likelihood) {
    const Eigen::Index causes = log_prior.size();
    Eigen::ArrayXXd slope(causes, causes);
    for (Eigen::Index j = 0; j < causes; ++j) {
        const OneAgainstOthers parts = one_against_others("prior_derivative", log_prior, log_likelihood, j);
        const auto log_product = [](double odds) { return log_probability(odds) + log_probability(-odds); };
        const double own =
            std::exp(log_product(parts.log_posterior_odds()) - log_product(parts.log_prior_odds));
        slope.col(j) = -own * parts.log_share.exp();
        slope(j, j) = own;
    }
    return slope;
}

}  // namespace steelyard::engine
