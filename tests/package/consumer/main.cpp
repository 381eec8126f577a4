// SPDX-License-Identifier: Apache-2.0
// An outside program that weighs two causes by the engine and opens the shipped sets.
#include <cmath>
#include <cstdio>
#include <steelyard/engine/posterior.hpp>
#include <steelyard/likelihoods/read_table_set.hpp>
#include <steelyard/priors/prior_set.hpp>

int main() {
    // Prior odds 3 to 1, one finding three times as likely under the first cause: 9 to 1.
    const Eigen::ArrayXd log_prior = Eigen::ArrayXd{{std::log(0.75), std::log(0.25)}};
    const Eigen::ArrayXXd loglik = Eigen::ArrayXXd{{std::log(0.6), std::log(0.2)}};
    const Eigen::ArrayXd weight = Eigen::ArrayXd::Ones(1);
    const Eigen::ArrayXd posterior = steelyard::engine::posterior(log_prior, loglik, weight);
    std::printf("%.3f %.3f\n", posterior(0), posterior(1));
    const auto tables = steelyard::likelihoods::open_table_set("adult");
    const auto priors = steelyard::priors::open_prior_set("even");
    return tables.tables.empty() || priors.causes.empty() ? 1 : 0;
}
