// SPDX-License-Identifier: Apache-2.0
// Do the intervals hold what they should? 1,500 simulated studies: six causes, three findings of five bands,
// true rows fixed; in each study 20 to 60 patients a cause are counted, the rows are compiled from those
// counts, and the 95 % interval of each posterior is asked to hold the posterior under the true rows. An
// independent computation of the same kind gave 94.5 %.
#include <gtest/gtest.h>

#include <random>

#include "steelyard/engine/log_math.hpp"
#include "uncertain_problems.hpp"

namespace steelyard::test {
namespace {

constexpr Eigen::Index causes = 6;
constexpr Eigen::Index findings = 3;
constexpr Eigen::Index bands = 5;
constexpr int studies = 1500;

/// Counts of n patients over the bands of a row.
Eigen::ArrayXd counted(std::mt19937_64& random, const Eigen::ArrayXd& row, int n) {
    Eigen::ArrayXd counts = Eigen::ArrayXd::Zero(bands);
    std::discrete_distribution<Eigen::Index> band(row.begin(), row.end());
    for (int i = 0; i < n; ++i) {
        counts(band(random)) += 1.0;
    }
    return counts;
}

TEST(Coverage, OfThePosteriorsUnderTheTrueRows) {
    std::mt19937_64 random(20260101);
    std::gamma_distribution<double> gamma(1.5);
    std::vector<std::vector<Eigen::ArrayXd>> truth(findings);
    for (auto& finding : truth) {
        for (Eigen::Index k = 0; k < causes; ++k) {
            const Eigen::ArrayXd row =
                Eigen::ArrayXd::NullaryExpr(bands, [&] { return gamma(random) + 0.1; });
            finding.emplace_back(row / row.sum());
        }
    }
    const std::vector<double> prior = {0.3, 0.2, 0.2, 0.1, 0.1, 0.1};
    std::uniform_int_distribution<int> patients(20, 60);
    std::uniform_int_distribution<Eigen::Index> any_band(0, bands - 1);

    double held = 0.0;
    for (int study = 0; study < studies; ++study) {
        engine::UncertainProblem problem = known_priors(prior);
        Eigen::ArrayXd score(causes);
        for (Eigen::Index k = 0; k < causes; ++k) {
            score(k) = std::log(prior[static_cast<std::size_t>(k)]);
        }
        std::vector<int> size(causes);
        for (int& n : size) {
            n = patients(random);
        }
        for (const auto& finding : truth) {
            const Eigen::Index seen = any_band(random);
            std::vector<engine::CompiledRow> rows;
            for (std::size_t k = 0; k < finding.size(); ++k) {
                rows.push_back(engine::counts_row(counted(random, finding[k], size[k])));
                score(static_cast<Eigen::Index>(k)) += std::log(finding[k](seen));
            }
            add_finding(problem, rows, seen);
        }
        const Eigen::ArrayXd true_posterior = engine::softmax(score);
        engine::SpreadOptions options;
        options.draws = 1024;
        options.seed = static_cast<std::uint64_t>(study);
        options.threads = 2;
        const engine::PosteriorSpread spread = posterior_spread(engine::UncertainPosterior(problem), options);
        held += (spread.low <= true_posterior && true_posterior <= spread.high).cast<double>().sum();
    }
    const double coverage = held / (studies * causes);
    RecordProperty("coverage", std::to_string(coverage));
    EXPECT_GE(coverage, 0.93);
    EXPECT_LE(coverage, 0.97);
}

}  // namespace
}  // namespace steelyard::test
