// SPDX-License-Identifier: Apache-2.0
// The factor on one row at which another cause ties: put into the row, it gives a tie.
#include "steelyard/engine/evidence_factor.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>

#include "expect_domain_error.hpp"
#include "steelyard/engine/posterior.hpp"

namespace steelyard::test {
namespace {

using engine::CauseIndex;

Eigen::ArrayXd random_array(Eigen::Index size, int low, int high) {
    return Eigen::ArrayXd::NullaryExpr(size, [&] { return *rc::gen::inRange(low, high) / 100.0; });
}

TEST(EvidenceFactor, PutIntoTheRowItGivesATie) {
    EXPECT_TRUE(rc::check([] {
        const auto causes = *rc::gen::inRange<Eigen::Index>(2, 7);
        const auto findings = *rc::gen::inRange<Eigen::Index>(1, 5);
        const Eigen::ArrayXd log_prior = random_array(causes, -500, 0);
        Eigen::ArrayXXd loglik(findings, causes);
        for (Eigen::Index f = 0; f < findings; ++f) {
            loglik.row(f) = random_array(causes, -500, 0).transpose() - 50.0;  // room for a factor above 1
        }
        const Eigen::ArrayXd weight = random_array(findings, 20, 101);
        const auto finding = *rc::gen::inRange<Eigen::Index>(0, findings);
        std::vector<bool> takes;
        for (Eigen::Index k = 0; k < causes; ++k) {
            takes.push_back(*rc::gen::arbitrary<bool>());
        }
        const Eigen::ArrayXd scores = engine::log_scores(log_prior, loglik, weight);
        Eigen::Index leader = 0;
        scores.maxCoeff(&leader);
        const std::optional<engine::TieFactor> tie =
            engine::factor_to_tie(scores, takes, weight(finding), CauseIndex{leader});
        const auto takers = std::count(takes.begin(), takes.end(), true);
        RC_ASSERT(tie.has_value() == (takers > 0 && takers < causes));
        if (!tie) {
            return;
        }
        for (Eigen::Index k = 0; k < causes; ++k) {
            loglik(finding, k) += takes[static_cast<std::size_t>(k)] ? tie->log_factor : 0.0;
        }
        const double odds =
            engine::log_posterior_odds(log_prior, loglik, weight, CauseIndex{leader}, tie->rival);
        RC_ASSERT(std::abs(odds) < 1e-12);
        // It is a tie for the lead: nobody else is ahead.
        RC_ASSERT(engine::log_scores(log_prior, loglik, weight)(leader) > -1e-12);
    }));
}

TEST(EvidenceFactor, OfTwoCausesItIsThePosteriorOdds) {
    const Eigen::ArrayXd scores = (Eigen::ArrayXd(2) << 0.0, -std::log(8.0)).finished();
    EXPECT_NEAR(std::exp(engine::factor_to_tie(scores, {true, false}, 1.0, CauseIndex{0})->log_factor),
                1.0 / 8.0, 1e-15);
    EXPECT_NEAR(std::exp(engine::factor_to_tie(scores, {false, true}, 1.0, CauseIndex{0})->log_factor), 8.0,
                1e-14);
    // A finding of half the weight must be wrong by the square.
    EXPECT_NEAR(std::exp(engine::factor_to_tie(scores, {false, true}, 0.5, CauseIndex{0})->log_factor), 64.0,
                1e-12);
}

TEST(EvidenceFactor, RefusesWhatHasNoMeaning) {
    const Eigen::ArrayXd scores = Eigen::ArrayXd::Zero(2);
    expect_domain_error([&] { static_cast<void>(engine::factor_to_tie(scores, {true}, 1.0, CauseIndex{0})); },
                        "factor_to_tie", "takes size", {}, 1.0, "2");
    expect_domain_error(
        [&] {
            static_cast<void>(engine::factor_to_tie(scores, {true, false}, 0.0, CauseIndex{0}));
        },
        "factor_to_tie", "weight", {}, 0.0, "in (0, 1]");
    expect_domain_error(
        [&] {
            static_cast<void>(engine::factor_to_tie(scores, {true, false}, 1.0, CauseIndex{2}));
        },
        "factor_to_tie", "leader", {}, 2.0, "between 0 and 1");
}

}  // namespace
}  // namespace steelyard::test
