// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/prior_sensitivity.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>
#include <optional>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/log_math.hpp"
#include "steelyard/engine/posterior.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

/// The posterior as the program computes it, all findings in one line.
Eigen::ArrayXd after(const Eigen::ArrayXd& log_prior, const Eigen::ArrayXd& log_likelihood) {
    return posterior(log_prior, log_likelihood.transpose(), Eigen::ArrayXd::Ones(1));
}

double log_odds_after(const Eigen::ArrayXd& log_prior, const Eigen::ArrayXd& log_likelihood, CauseIndex a,
                      CauseIndex b) {
    return log_posterior_odds(log_prior, log_likelihood.transpose(), Eigen::ArrayXd::Ones(1), a, b);
}

/// 2 to 7 causes, priors within e^+-20 of each other, likelihoods down to e^-200.
struct Case {
    Eigen::ArrayXd log_prior, log_likelihood;
    CauseIndex one, other;
};

Case random_case() {
    const int causes = *rc::gen::inRange(2, 8);
    const auto list = *rc::gen::container<std::vector<int>>(static_cast<std::size_t>(2 * causes),
                                                            rc::gen::inRange(0, 20000));
    const Eigen::ArrayXd all = Eigen::Map<const Eigen::ArrayXi>(list.data(), 2 * causes).cast<double>();
    const int one = *rc::gen::inRange(0, causes);
    const int step = *rc::gen::inRange(1, causes);
    return {all.head(causes) / 500.0 - 20.0, -all.tail(causes) / 100.0, CauseIndex{one},
            CauseIndex{(one + step) % causes}};
}

TEST(TippingPrior, OfTheHandbookCase) {
    // Priors 0.5, 0.3, 0.2 and likelihoods 0.02, 0.18, 0.21. By hand: B ties with C at a prior p where
    // 0.18 p = 0.21 * (1 - p) 0.2/0.7, that is p = 0.06/0.24; the odds B:C from 3:2 to 7:6, a factor of 7/9.
    const Eigen::ArrayXd log_prior = array({0.5, 0.3, 0.2}).log();
    const Eigen::ArrayXd log_likelihood = array({0.02, 0.18, 0.21}).log();
    const TippingPrior tip = tipping_prior(log_prior, log_likelihood, CauseIndex{2}, CauseIndex{1});
    EXPECT_TRUE(near_rel(0.25, tip.prior.to_probability().value(), 1e-14));
    EXPECT_TRUE(near_rel(7.0 / 9.0, tip.odds_factor.to_ratio(), 1e-14));
    EXPECT_TRUE(near_rel(std::log(1.0 / 3.0), tip.prior.to_nats(), 1e-14));
}

TEST(TippingPrior, PutBackGivesATie) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const TippingPrior tip = tipping_prior(c.log_prior, c.log_likelihood, c.one, c.other);
        const Eigen::ArrayXd moved = with_prior(c.log_prior, c.other, tip.prior);
        RC_ASSERT(near_abs(0.0, log_odds_after(moved, c.log_likelihood, c.one, c.other), 1e-12));
        const Eigen::ArrayXd tied = after(moved, c.log_likelihood);
        RC_ASSERT(near_rel(tied(c.one.value), tied(c.other.value), 1e-12));
        // The factor says the same: it leads from the prior odds as they are to those of the tie.
        Eigen::ArrayXd multiplied = c.log_prior;
        multiplied(c.other.value) += tip.odds_factor.to_nats();
        RC_ASSERT(near_abs(0.0, log_odds_after(multiplied, c.log_likelihood, c.one, c.other), 1e-12));
        RC_ASSERT(near_abs(tip.odds_factor.to_nats(),
                           log_odds_after(c.log_prior, c.log_likelihood, c.one, c.other), 1e-12));
    }));
}

TEST(TippingPrior, OfOneHalfWhenTwoCausesAreAlike) {
    const Eigen::ArrayXd even = Eigen::ArrayXd::Zero(2);
    const TippingPrior tip = tipping_prior(even, even, CauseIndex{0}, CauseIndex{1});
    EXPECT_EQ(tip.prior.to_nats(), 0.0);
    EXPECT_EQ(tip.odds_factor.to_ratio(), 1.0);
}

TEST(TippingPrior, KeepsItsLogOddsWhereTheProbabilityRounds) {
    const Eigen::ArrayXd even = Eigen::ArrayXd::Zero(3);
    const Eigen::ArrayXd far = array({-5000.0, -2000.0, -3000.0});
    // By hand, priors 1/3 each: l_leader / l_rival times 1/2, the leader's part of the others.
    const TippingPrior low = tipping_prior(even, far, CauseIndex{0}, CauseIndex{1});
    EXPECT_EQ(low.prior.to_probability().value(), 0.0);
    EXPECT_TRUE(near_rel(-3000.0 - std::log(2.0), low.prior.to_nats(), 1e-15));
    const TippingPrior high = tipping_prior(even, far, CauseIndex{1}, CauseIndex{0});
    EXPECT_EQ(high.prior.to_probability().value(), 1.0);
    EXPECT_EQ(high.odds_factor.to_nats(), 3000.0);
    EXPECT_TRUE(near_abs(
        0.0, log_odds_after(with_prior(even, CauseIndex{1}, low.prior), far, CauseIndex{0}, CauseIndex{1}),
        1e-11));
    EXPECT_TRUE(near_abs(
        0.0, log_odds_after(with_prior(even, CauseIndex{0}, high.prior), far, CauseIndex{0}, CauseIndex{1}),
        1e-11));
}

TEST(PriorForPosterior, PutBackGivesTheTarget) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const double share = (*rc::gen::inRange(0, 1000000) + 0.5) / 1e6;
        const double exponent = *rc::gen::inRange(-250, 1);
        const double target = *rc::gen::arbitrary<bool>() ? share : share * std::pow(10.0, exponent);
        const LogOdds prior =
            prior_for_posterior(c.log_prior, c.log_likelihood, c.one, Probability::of(target));
        const Eigen::ArrayXd moved = with_prior(c.log_prior, c.one, prior);
        RC_ASSERT(near_rel(target, after(moved, c.log_likelihood)(c.one.value), 1e-12));
    }));
}

TEST(WithPrior, KeepsTheProportionsOfTheOthers) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const double p = (*rc::gen::inRange(0, 1000000) + 0.5) / 1e6;
        const Eigen::ArrayXd moved = with_prior(c.log_prior, c.one, Probability::of(p));
        RC_ASSERT(near_rel(p, std::exp(moved(c.one.value)), 1e-14));
        RC_ASSERT(near_abs(0.0, log_sum_exp(moved), 1e-14));
        for (Eigen::Index k = 0; k < moved.size(); ++k) {
            if (k != c.one.value) {
                const Eigen::Index other = c.other.value;
                RC_ASSERT(near_abs(c.log_prior(k) - c.log_prior(other), moved(k) - moved(other), 1e-13));
            }
        }
    }));
}

TEST(PriorSweep, IsThePosteriorOfEachPrior) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::ArrayXd grid = array({1e-300, 1e-9, 0.01, 0.3, 0.5, 0.9, 1.0 - 1e-12});
        const Eigen::ArrayXXd sweep = prior_sweep(c.log_prior, c.log_likelihood, c.one, grid);
        RC_ASSERT((sweep.rows() == c.log_prior.size() && sweep.cols() == grid.size()));
        RC_ASSERT((sweep.colwise().sum() - 1.0).abs().maxCoeff() <= 16.0 * 0x1p-52);
        for (Eigen::Index g = 0; g < grid.size(); ++g) {
            const Eigen::ArrayXd moved = with_prior(c.log_prior, c.one, Probability::of(grid(g)));
            const Eigen::ArrayXd expected = after(moved, c.log_likelihood);
            for (Eigen::Index k = 0; k < expected.size(); ++k) {
                RC_ASSERT(near_rel(expected(k), sweep(k, g), 1e-12));
            }
            RC_ASSERT((g == 0 || sweep(c.one.value, g) >= sweep(c.one.value, g - 1)));
        }
    }));
}

TEST(PriorDerivative, IsTheSlopeOfTheSweep) {
    EXPECT_TRUE(rc::check([] {
        Case c = random_case();
        c.log_prior /= 10.0;
        c.log_likelihood /= 50.0;
        const Eigen::ArrayXXd slope = prior_derivative(c.log_prior, c.log_likelihood);
        RC_ASSERT(slope.colwise().sum().abs().maxCoeff() <= 1e-13 * slope.abs().maxCoeff());
        const double prior = std::exp(c.log_prior(c.one.value) - log_sum_exp(c.log_prior));
        const double step = 1e-4 * prior * (1.0 - prior);
        const Eigen::ArrayXXd ends =
            prior_sweep(c.log_prior, c.log_likelihood, c.one, array({prior - step, prior + step}));
        for (Eigen::Index k = 0; k < slope.rows(); ++k) {
            const double between = (ends(k, 1) - ends(k, 0)) / (2.0 * step);
            RC_ASSERT(
                near_abs(between, slope(k, c.one.value), 1e-6 * slope.col(c.one.value).abs().maxCoeff()));
        }
    }));
}

TEST(PriorSensitivity, RefusesWhatCannotBe) {
    const std::optional<Eigen::Index> none;
    const Eigen::ArrayXd even = array({0.0, 0.0});
    const CauseIndex first{0};
    const CauseIndex second{1};
    expect_domain_error([&] { (void)tipping_prior(even, array({0.0}), first, second); }, "tipping_prior",
                        "log_likelihood size", {}, 1, "2");
    expect_domain_error([&] { (void)tipping_prior(array({0.0}), array({0.0}), first, first); },
                        "tipping_prior", "log_prior size", {}, 1, "at least 2");
    expect_domain_error(
        [&] {
            (void)tipping_prior(even, array({0.0, nan}), first, second);
        },
        "tipping_prior", "log_likelihood", {1, none}, nan, "finite");
    expect_domain_error([&] { (void)tipping_prior(even, even, first, first); }, "tipping_prior", "leader", {},
                        0, "another cause than the rival");
    expect_domain_error([&] { (void)tipping_prior(even, even, first, CauseIndex{2}); }, "tipping_prior",
                        "rival", {}, 2, "between 0 and 1");
    expect_domain_error([&] { (void)tipping_prior(even, even, CauseIndex{-1}, first); }, "tipping_prior",
                        "leader", {}, -1, "between 0 and 1");
    expect_domain_error(
        [&] {
            (void)tipping_prior(array({-1e308, 1e308}), even, first, second);
        },
        "tipping_prior", "score", {0, none}, -infinity, "finite: the sum overflows");
    expect_domain_error([&] { (void)prior_for_posterior(even, even, first, Probability::of(1.0)); },
                        "prior_for_posterior", "target", {}, 1, "> 0 and < 1");
    expect_domain_error(
        [&] {
            (void)prior_sweep(even, even, first, array({0.5, 0.0}));
        },
        "prior_sweep", "priors", {1, none}, 0, "> 0 and < 1");
    expect_domain_error([&] { (void)prior_sweep(even, even, first, array({nan})); }, "prior_sweep", "priors",
                        {0, none}, nan, "> 0 and < 1");
    expect_domain_error([&] { (void)with_prior(even, first, Probability::of(0.0)); }, "with_prior",
                        "probability", {}, 0, "> 0 and < 1");
    expect_domain_error([&] { (void)with_prior(even, first, LogOdds::nats(infinity)); }, "with_prior", "odds",
                        {}, infinity, "finite");
    expect_domain_error(
        [&] {
            (void)prior_derivative(array({0.0, infinity}), even);
        },
        "prior_derivative", "log_prior", {1, none}, infinity, "finite");
}

}  // namespace
