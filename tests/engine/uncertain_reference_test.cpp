// SPDX-License-Identifier: Apache-2.0
// Draws of the posterior against values from outside: quantiles, means and standard deviations found without
// draws (scipy 1.10.1: characteristic functions, quadrature, closed forms) and with 4 million draws of
// another library (numpy 1.24.2). The inputs and values are those of tests/reference/uncertain_inputs.json
// and uncertain.csv; each line names its origin.
#include <gtest/gtest.h>

#include <cmath>

#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/distributions.hpp"
#include "steelyard/engine/posterior.hpp"
#include "uncertain_problems.hpp"

namespace steelyard::test {
namespace {

using engine::counts_row;
using engine::UncertainProblem;

constexpr Eigen::Index draws = 400'000;
constexpr double sigmas = 5.0;  // of Monte-Carlo error: one comparison in a million fails by chance

/// Whether a drawn value agrees with a reference that may have an error of its own.
void expect_drawn(const ReferenceTable& table, const std::string& which, const std::string& quantity,
                  double got, double error, double reference_error = 0.0) {
    const double wanted = table.value(which, quantity);
    table.rows().at({which, quantity}).used = true;
    EXPECT_NEAR(got, wanted, sigmas * std::hypot(error, reference_error)) << which << " " << quantity;
}

double reference_error(const ReferenceTable& table, const std::string& which, const std::string& quantity) {
    table.rows().at({which, quantity}).used = true;
    return table.value(which, quantity);
}

Eigen::ArrayXd mean_posterior(const UncertainProblem& problem) {
    Eigen::ArrayXd log_prior(static_cast<Eigen::Index>(problem.priors.size()));
    for (Eigen::Index k = 0; k < log_prior.size(); ++k) {
        log_prior(k) = problem.priors[static_cast<std::size_t>(k)].log_value;
    }
    Eigen::ArrayXXd loglik(problem.row_of.rows(), problem.row_of.cols());
    for (Eigen::Index f = 0; f < loglik.rows(); ++f) {
        for (Eigen::Index k = 0; k < loglik.cols(); ++k) {
            loglik(f, k) = problem.rows[static_cast<std::size_t>(problem.row_of(f, k))].log_share;
        }
    }
    return engine::posterior(log_prior, loglik, problem.weight);
}

engine::PosteriorSpread spread_of(const UncertainProblem& problem, std::uint64_t seed) {
    engine::SpreadOptions options;
    options.draws = draws;
    options.seed = seed;
    options.threads = 2;
    return posterior_spread(engine::UncertainPosterior(problem), options);
}

/// A finding of C bands of which only "seen" and "all" are known: the other bands share the rest, which
/// changes nothing.
engine::CompiledRow row_with(double seen, double all, Eigen::Index bands) {
    Eigen::ArrayXd counts = Eigen::ArrayXd::Constant(bands, (all - seen) / static_cast<double>(bands - 1));
    counts(0) = seen;
    return counts_row(counts);
}

TEST(UncertainReference, TwoCausesOfCounts) {
    const ReferenceTable table("uncertain.csv");
    const nlohmann::json inputs = reference_json("uncertain_inputs.json");
    for (const nlohmann::json& example : inputs["two_causes_beta"]) {
        const std::string which = example["id"];
        const double prior = number(example["prior"]);
        UncertainProblem problem = known_priors({prior, 1.0 - prior});
        for (const nlohmann::json& finding : example["findings"]) {
            const Eigen::Index bands = finding["categories"];
            const Eigen::ArrayXd with = numbers(finding["with"]);
            const Eigen::ArrayXd without = numbers(finding["without"]);
            add_finding(problem, {row_with(with(0), with(1), bands), row_with(without(0), without(1), bands)},
                        0);
        }
        const double at_means = mean_posterior(problem)(0);
        EXPECT_TRUE(table.matches(which, "posterior_with_mean_tables", at_means));
        EXPECT_TRUE(table.matches(which, "delta_logit_mean", std::log(at_means / (1.0 - at_means))));

        const engine::PosteriorSpread spread = spread_of(problem, example["seed"]);
        const double root = std::sqrt(static_cast<double>(draws));
        expect_drawn(table, which, "mean_of_posterior", spread.mean(0), spread.sd(0) / root);
        expect_drawn(table, which, "sd_of_posterior", spread.sd(0), spread.sd(0) / root);
        expect_drawn(table, which, "quantile_0.025", spread.low(0), spread.low_error(0));
        expect_drawn(table, which, "quantile_0.5", spread.median(0), 1.3 * spread.sd(0) / root);
        expect_drawn(table, which, "quantile_0.975", spread.high(0), spread.high_error(0));
        EXPECT_LT(spread.low_error(0), 0.002);

        const engine::UncertainPosterior posterior(problem);
        const Eigen::ArrayXXd all = all_draws(posterior, example["seed"], draws);
        const Eigen::ArrayXd logit = (all.col(0) / all.col(1)).log();
        const double sd = std::sqrt((logit - logit.mean()).square().mean());
        expect_drawn(table, which, "logit_mean_exact", logit.mean(), sd / root);
        expect_drawn(table, which, "logit_sd_exact", sd, 1.5 * sd / root);
    }
}

/// A ratio with a log-normal law against a row that is known: the posterior's quantiles are closed form.
TEST(UncertainReference, TwoCausesOfRatios) {
    const ReferenceTable table("uncertain.csv");
    const nlohmann::json inputs = reference_json("uncertain_inputs.json");
    for (const nlohmann::json& example : inputs["two_causes_lognormal"]) {
        const std::string which = example["id"];
        const double prior = number(example["prior"]);
        UncertainProblem problem = known_priors({prior, 1.0 - prior});
        for (const nlohmann::json& finding : example["findings"]) {
            const double ratio = finding["lr"];
            const double low = finding["ci"][0];
            const double high = finding["ci"][1];
            const double log_sd = std::log(high / low) / (2.0 * engine::normal_quantile(0.975));
            const nlohmann::json& written = finding["lr"];
            EXPECT_TRUE(table.matches(which, "se_lnLR_from_ci[LR=" + written.dump() + "]", log_sd));
            constexpr double share = 1e-4;  // small, so that no drawn share reaches 1
            engine::CompiledRow with;
            with.probability = (Eigen::ArrayXd(2) << ratio * share, 1.0 - ratio * share).finished();
            with.law = engine::RatioLaw{with.probability.log(), Eigen::ArrayXd::Constant(2, log_sd)};
            engine::CompiledRow without;
            without.probability = (Eigen::ArrayXd(2) << share, 1.0 - share).finished();
            without.law = engine::RatioLaw{without.probability.log(), Eigen::ArrayXd::Zero(2)};
            add_finding(problem, {with, without}, 0);
        }
        const engine::PosteriorSpread spread = spread_of(problem, 7);
        const double root = std::sqrt(static_cast<double>(draws));
        expect_drawn(table, which, "median", spread.median(0), 1.3 * spread.sd(0) / root);
        expect_drawn(table, which, "q0.025", spread.low(0), spread.low_error(0));
        expect_drawn(table, which, "q0.975", spread.high(0), spread.high_error(0));
        expect_drawn(table, which, "mean", spread.mean(0), spread.sd(0) / root);
        expect_drawn(table, which, "sd", spread.sd(0), spread.sd(0) / root);
    }
}

TEST(UncertainReference, ThreeCausesWithKnownAndWithDrawnPriors) {
    const ReferenceTable table("uncertain.csv");
    const nlohmann::json inputs = reference_json("uncertain_inputs.json");
    for (const nlohmann::json& example : inputs["k_causes_dirichlet_mc"]) {
        const std::string which = example["id"];
        const bool drawn = example.contains("prior_dirichlet");
        const Eigen::ArrayXd weights = numbers(drawn ? example["prior_dirichlet"] : example["prior_odds"]);
        UncertainProblem problem = known_priors({weights.begin(), weights.end()});
        if (drawn) {
            for (std::size_t k = 0; k < problem.priors.size(); ++k) {
                problem.priors[k].law = engine::CountedPrior{weights(static_cast<Eigen::Index>(k))};
                problem.priors[k].stream = static_cast<std::uint32_t>(k);
            }
        }
        const double alpha = number(example["alpha"]);
        for (const nlohmann::json& finding : example["findings"]) {
            std::vector<engine::CompiledRow> rows;
            for (const nlohmann::json& counts : finding["counts"]) {
                rows.push_back(counts_row(numbers(counts), alpha));
            }
            add_finding(problem, rows, finding["observed"]);
        }
        const Eigen::ArrayXd at_means = mean_posterior(problem);
        const engine::PosteriorSpread spread = spread_of(problem, example["seed"]);
        const double root = std::sqrt(static_cast<double>(draws));
        const std::vector<std::string> causes = example["causes"];
        for (std::size_t k = 0; k < causes.size(); ++k) {
            const auto cause = static_cast<Eigen::Index>(k);
            const std::string name = "[" + causes[k] + "]";
            EXPECT_TRUE(table.matches(which, "posterior_with_mean_tables" + name, at_means(cause)));
            const auto compare = [&](const std::string& quantity, double got, double error) {
                expect_drawn(table, which, quantity + name, got, error,
                             reference_error(table, which, quantity + "_mcse" + name));
            };
            compare("mc_mean", spread.mean(cause), spread.sd(cause) / root);
            compare("mc_sd", spread.sd(cause), spread.sd(cause) / root);
            compare("mc_q0.025", spread.low(cause), spread.low_error(cause));
            compare("mc_q0.5", spread.median(cause), 1.3 * spread.sd(cause) / root);
            compare("mc_q0.975", spread.high(cause), spread.high_error(cause));
            compare("mc_prob_top", spread.leads(cause), spread.leads_error(cause));
        }
    }
}

/// Every line of the table belongs to one of the three tests above; none is left out by a slip in a name.
TEST(UncertainReference, TheTableHoldsNothingElse) {
    const ReferenceTable table("uncertain.csv");
    for (const auto& [key, row] : table.rows()) {
        EXPECT_TRUE(key.first.starts_with("U") || key.first.starts_with("N") || key.first.starts_with("M"))
            << key.first;
    }
    EXPECT_EQ(table.rows().size(), 3U * 9U + (2U * 5U + 3U) + 2U * 3U * 13U);
}

}  // namespace
}  // namespace steelyard::test
