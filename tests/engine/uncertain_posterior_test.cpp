// SPDX-License-Identifier: Apache-2.0
// Properties of the draws: same numbers for any number of threads, laws of single rows and priors, failure
// paths.
#include "steelyard/engine/uncertain_posterior.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/gamma.hpp>
#include <cmath>
#include <numbers>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/distributions.hpp"
#include "uncertain_problems.hpp"

namespace steelyard::test {
namespace {

using engine::counts_row;
using engine::PosteriorSpread;
using engine::SpreadOptions;
using engine::UncertainPosterior;
using engine::UncertainProblem;

Eigen::ArrayXd array(std::initializer_list<double> values) {
    Eigen::ArrayXd result(static_cast<Eigen::Index>(values.size()));
    Eigen::Index at = 0;
    for (const double value : values) {
        result(at++) = value;
    }
    return result;
}

/// Three causes, three findings of every kind of law, priors of every kind.
UncertainProblem mixed_problem() {
    UncertainProblem problem = known_priors({3.0, 2.0, 1.0});
    problem.priors[0].law = engine::CountedPrior{3.0};
    problem.priors[0].stream = 0;
    problem.priors[1].law = engine::RangedPrior{std::log(1.0), std::log(5.0), false};
    problem.priors[1].stream = 1;
    add_finding(problem,
                {counts_row(array({3, 9, 1})), counts_row(array({1, 1, 12})), counts_row(array({0, 4, 4}))},
                1, 0.8);
    const Eigen::ArrayXd edges = array({-1.0, 0.5});
    add_finding(problem,
                {engine::summary_row(0.0, 1.0, 8, engine::Scale::linear, edges),
                 engine::summary_row(1.0, 1.5, 3, engine::Scale::linear, edges),
                 engine::summary_row(-2.0, 0.4, 20, engine::Scale::linear, edges)},
                1);
    const engine::CompiledRow base = counts_row(array({5, 6, 7}));
    const engine::CompiledRow against =
        engine::ratio_row(array({1.5, 1.0, 0.64}), array({0.2, 0.3, 0.2}), base.probability, 0.05).row;
    add_finding(problem, {base, against, counts_row(array({9, 2, 2}))}, 2);
    problem.rows[7].reference = 6;
    return problem;
}

PosteriorSpread spread_with(int threads, Eigen::Index draws, std::uint64_t seed = 5) {
    SpreadOptions options;
    options.draws = draws;
    options.seed = seed;
    options.threads = threads;
    return posterior_spread(UncertainPosterior(mixed_problem()), options);
}

bool same_bits(const PosteriorSpread& a, const PosteriorSpread& b) {
    return (a.low == b.low).all() && (a.high == b.high).all() && (a.low_error == b.low_error).all() &&
           (a.high_error == b.high_error).all() && (a.median == b.median).all() && (a.mean == b.mean).all() &&
           (a.sd == b.sd).all() && (a.leads == b.leads).all() && a.draws == b.draws;
}

TEST(UncertainPosterior, SameBitsForAnyNumberOfThreadsAndOnASecondRun) {
    const PosteriorSpread one = spread_with(1, 10'500);
    EXPECT_TRUE(same_bits(one, spread_with(2, 10'500)));
    EXPECT_TRUE(same_bits(one, spread_with(7, 10'500)));
    EXPECT_TRUE(same_bits(one, spread_with(1, 10'500)));
    EXPECT_FALSE(same_bits(one, spread_with(1, 10'500, 6)));
}

TEST(UncertainPosterior, ADrawDependsOnItsNumberAndTheSeedAlone) {
    const UncertainPosterior posterior(mixed_problem());
    const Eigen::ArrayXXd few = all_draws(posterior, 3, 1500);
    const Eigen::ArrayXXd many = all_draws(posterior, 3, 4000);
    EXPECT_TRUE((few == many.topRows(1500)).all());
    EXPECT_TRUE(((few.rowwise().sum() - 1.0).abs() < 1e-14).all());
    EXPECT_TRUE((few >= 0.0).all());
}

/// A row keeps its draws whatever other findings a case has: one set of draws serves all cases.
TEST(UncertainPosterior, ARowsDrawsDoNotDependOnTheOtherRows) {
    UncertainProblem alone = known_priors({3.0, 2.0, 1.0});
    const UncertainProblem all = mixed_problem();
    alone.rows = {all.rows[6], all.rows[7], all.rows[8]};
    alone.rows[1].reference = 0;
    alone.row_of = (Eigen::ArrayXXi(1, 3) << 0, 1, 2).finished();
    alone.weight = array({1.0});
    const UncertainPosterior few(alone);
    const UncertainPosterior many(all);
    const Eigen::ArrayXXd u = Eigen::ArrayXXd::Constant(4, 3, 0.3);
    EXPECT_TRUE((few.contribution(0, u) == many.contribution(2, u)).all());
}

/// Row and prior tables against Boost's own quantile functions.
TEST(UncertainPosterior, SharesOfCountsAreThoseOfABetaLaw) {
    EXPECT_TRUE(rc::check([] {
        const double a = std::exp(*rc::gen::inRange(-300, 700) / 100.0);
        const double b = std::exp(*rc::gen::inRange(-70, 900) / 100.0);
        const double u = *rc::gen::inRange(1, 10'000) / 10'000.0;
        UncertainProblem problem = known_priors({1.0, 1.0});
        const engine::CompiledRow row{array({a / (a + b), b / (a + b)}), engine::DirichletLaw{array({a, b})}};
        add_finding(problem, {row, row}, 0);
        const UncertainPosterior posterior(problem);
        const double drawn = posterior.contribution(0, Eigen::ArrayXXd::Constant(1, 2, u))(0, 0);
        const boost::math::beta_distribution<double> law(a, b);
        const double exact = std::log(boost::math::quantile(law, u));
        // On the scale of normal deviates: what deviation of u the error of the drawn value amounts to.
        const double back = boost::math::cdf(law, std::exp(drawn));
        RC_LOG() << "a " << a << " b " << b << " u " << u << " drawn " << drawn << " exact " << exact;
        if (exact > -600.0 && back > 0.0 && back < 1.0) {
            RC_ASSERT(std::abs(engine::normal_quantile(back) - engine::normal_quantile(u)) < 2e-3);
        }
    }));
}

TEST(UncertainPosterior, SharesOfAMeanAndSpreadFollowTheirNormalLaw) {
    // 1/2 and 1/2: the variance at its median, the mean as stated.
    UncertainProblem problem = known_priors({1.0, 1.0});
    const engine::CompiledRow row =
        engine::summary_row(10.0, 2.0, 5, engine::Scale::linear, array({9.0, 12.0}));
    add_finding(problem, {row, row}, 1);
    const UncertainPosterior posterior(problem);
    const double drawn = posterior.contribution(0, Eigen::ArrayXXd::Constant(1, 4, 0.5))(0, 0);
    // Median of chi-square with 4 degrees of freedom: 3.3566939800 (tables; Boost.Math).
    const boost::math::gamma_distribution<double> half_chi_square(2.0, 2.0);
    const double sigma = 2.0 / std::sqrt(boost::math::median(half_chi_square) / 4.0);
    const double share = engine::normal_lower(2.0 / sigma) - engine::normal_lower(-1.0 / sigma);
    EXPECT_NEAR(std::exp(drawn), share, 1e-5);
}

/// E[share] over the draws is the Student-t predictive that the weighing uses, for all laws with a mean.
TEST(UncertainPosterior, TheMeanOfTheDrawnSharesIsTheShareUsed) {
    const UncertainProblem problem = mixed_problem();
    const UncertainPosterior posterior(problem);
    constexpr Eigen::Index side = 400;
    for (const Eigen::Index finding : {0, 1}) {
        const Eigen::Index coordinates = posterior.coordinates(finding);
        Eigen::ArrayXXd grid(side * side, coordinates);
        for (Eigen::Index i = 0; i < side; ++i) {
            for (Eigen::Index j = 0; j < side; ++j) {
                for (Eigen::Index c = 0; c < coordinates; ++c) {
                    grid(i * side + j, c) = (static_cast<double>(c % 2 == 0 ? i : j) + 0.5) / side;
                }
            }
        }
        const Eigen::ArrayXXd log_share = posterior.contribution(finding, grid) / problem.weight(finding);
        for (Eigen::Index k = 0; k < 3; ++k) {
            const double used =
                std::exp(problem.rows[static_cast<std::size_t>(problem.row_of(finding, k))].log_share);
            EXPECT_NEAR(log_share.col(k).exp().mean(), used, 2e-3 * used) << finding << " " << k;
        }
    }
}

TEST(UncertainPosterior, ARowOfRatiosMovesWithTheRowItIsAgainst) {
    const UncertainProblem problem = mixed_problem();
    const UncertainPosterior posterior(problem);
    // Coordinates of finding 2: the base, the ratio row, the third row. The ratio's own deviate is 0 at 1/2.
    const Eigen::ArrayXXd u = (Eigen::ArrayXXd(2, 3) << 0.2, 0.5, 0.5, 0.9, 0.5, 0.5).finished();
    const Eigen::ArrayXXd log_share = posterior.contribution(2, u);
    EXPECT_NEAR(log_share(1, 1) - log_share(0, 1), log_share(1, 0) - log_share(0, 0), 1e-12);
    EXPECT_GT(log_share(1, 0), log_share(0, 0));
}

/// Two causes that take one row are drawn together, so that nothing of it parts them.
TEST(UncertainPosterior, ASharedRowIsOneDraw) {
    UncertainProblem problem = known_priors({1.0, 1.0, 1.0});
    add_finding(problem, {counts_row(array({3, 9})), counts_row(array({1, 1})), counts_row(array({4, 4}))},
                0);
    problem.row_of(0, 1) = 0;
    const Eigen::ArrayXXd drawn = all_draws(UncertainPosterior(problem), 1, 2000);
    EXPECT_TRUE((drawn.col(0) == drawn.col(1)).all());
    EXPECT_FALSE((drawn.col(0) == drawn.col(2)).all());
}

/// A `least` that acted on a mean and spread holds in every draw.
TEST(UncertainPosterior, ARaisedRowStaysRaised) {
    UncertainProblem problem = known_priors({1.0, 1.0});
    engine::CompiledRow row =
        engine::summary_row(0.0, 1.0, 10, engine::Scale::linear, array({4.0, 5.0, 6.0}));
    row.probability = engine::keep_at_least(row.probability, 0.01).probability;
    std::get<engine::SummaryLaw>(row.law).least = 0.01;
    add_finding(problem, {row, row}, 3);
    const UncertainPosterior posterior(problem);
    const double drawn = posterior.contribution(0, Eigen::ArrayXXd::Constant(1, 4, 0.5))(0, 0);
    EXPECT_NEAR(std::exp(drawn), 0.01 / 1.03, 1e-5);
    EXPECT_NEAR(std::exp(posterior.row_interval(0).low), 0.01 / 1.03, 1e-4);
}

/// 2.5 % and 97.5 % of a ranged prior are the ends of its range, also on the scale of odds.
TEST(UncertainPosterior, APriorsRangeIsItsInterval) {
    UncertainProblem problem = known_priors({0.2, 1.0});
    problem.priors[0].law = engine::RangedPrior{std::log(0.05), std::log(0.4), false};
    problem.priors[1] = {std::log(2.0), engine::RangedPrior{std::log(1.0), std::log(3.0), true}, 1};
    const UncertainPosterior posterior(problem);
    const Eigen::ArrayXXd u = (Eigen::ArrayXXd(3, 2) << 0.025, 0.025, 0.5, 0.5, 0.975, 0.975).finished();
    const Eigen::ArrayXXd weight = posterior.contribution(0, u).exp();
    EXPECT_TRUE(near_rel(0.05, weight(0, 0), 1e-3));
    EXPECT_TRUE(near_rel(0.2, weight(1, 0), 1e-9));
    EXPECT_TRUE(near_rel(0.4, weight(2, 0), 1e-3));
    EXPECT_TRUE(near_rel(1.0 / 2.0, weight(0, 1), 1e-3));
    EXPECT_TRUE(near_rel(2.0 / 3.0, weight(1, 1), 1e-9));
    EXPECT_TRUE(near_rel(3.0 / 4.0, weight(2, 1), 1e-3));
}

TEST(UncertainPosterior, CountedPriorsAreADirichlet) {
    UncertainProblem problem = known_priors({1.0, 3.0, 4.0});
    for (std::size_t k = 0; k < 3; ++k) {
        problem.priors[k].law = engine::CountedPrior{std::exp(problem.priors[k].log_value)};
        problem.priors[k].stream = static_cast<std::uint32_t>(k);
    }
    SpreadOptions options;
    options.draws = 200'000;
    const PosteriorSpread spread = posterior_spread(UncertainPosterior(problem), options);
    const boost::math::beta_distribution<double> margin(1.0, 7.0);
    EXPECT_NEAR(spread.low(0), boost::math::quantile(margin, 0.025), 5 * spread.low_error(0));
    EXPECT_NEAR(spread.high(0), boost::math::quantile(margin, 0.975), 5 * spread.high_error(0));
    EXPECT_NEAR(spread.mean(0), 1.0 / 8.0, 5 * spread.sd(0) / std::sqrt(2e5));
}

/// Weights of very few and of very many patients: the fewer, the less is known; no number of either is too
/// much.
TEST(UncertainPosterior, CountedPriorsOfAnySizeAreDrawn) {
    double spread_before = 0.0;
    for (const double worth : {1e12, 1e9, 1e7, 1e6, 1e3, 10.0, 0.1, 1e-3, 1e-6}) {
        UncertainProblem problem = known_priors({1.0, 2.0});
        for (std::size_t k = 0; k < 2; ++k) {
            problem.priors[k].law = engine::CountedPrior{worth * (k == 0 ? 1.0 / 3.0 : 2.0 / 3.0)};
            problem.priors[k].stream = static_cast<std::uint32_t>(k);
        }
        SpreadOptions options;
        options.draws = 40'000;
        const PosteriorSpread spread = posterior_spread(UncertainPosterior(problem), options);
        EXPECT_NEAR(spread.mean(0), 1.0 / 3.0, 0.01) << worth;
        EXPECT_GE(spread.sd(0), 0.99 * spread_before) << worth;
        // Of a Beta law: sqrt(p (1 - p) / (worth + 1)).
        EXPECT_TRUE(near_rel(std::sqrt(2.0 / 9.0 / (worth + 1.0)), spread.sd(0), 0.02)) << worth;
        spread_before = spread.sd(0);
    }
}

TEST(UncertainPosterior, AJudgedRowIsNotDrawnBelowItsLeast) {
    UncertainProblem problem = known_priors({1.0, 1.0});
    const engine::CompiledRow row = counts_row(array({0, 3}), 0.05);
    add_finding(problem, {row, row}, 0);
    problem.rows[0].least = 0.01;
    const UncertainPosterior posterior(problem);
    const Eigen::ArrayXXd drawn = posterior.contribution(0, Eigen::ArrayXXd::Constant(1, 2, 0.01));
    EXPECT_NEAR(std::exp(drawn(0, 0)), 0.01, 1e-15);
    EXPECT_LT(std::exp(drawn(0, 1)), 1e-9);
    EXPECT_NEAR(std::exp(posterior.row_interval(0).low), 0.01, 1e-15);
}

TEST(UncertainPosterior, RowIntervalsAreThoseOfTheirLaws) {
    const UncertainProblem problem = mixed_problem();
    const UncertainPosterior posterior(problem);
    const UncertainPosterior::LogInterval counts = posterior.row_interval(0);
    const boost::math::beta_distribution<double> beta(9.5, 5.0);
    EXPECT_NEAR(counts.low, std::log(boost::math::quantile(beta, 0.025)), 1e-4);
    EXPECT_NEAR(counts.high, std::log(boost::math::quantile(beta, 0.975)), 1e-4);
    const UncertainPosterior::LogInterval ratio = posterior.row_interval(7);
    EXPECT_NEAR(ratio.high - ratio.low, 2.0 * 1.959964 * 0.2, 1e-3);
    const UncertainPosterior::LogInterval summary = posterior.row_interval(3);
    EXPECT_LT(summary.low, problem.rows[3].log_share);
    EXPECT_GT(summary.high, problem.rows[3].log_share);
}

TEST(PosteriorSpread, DrawsUntilTheEndsAreKnown) {
    // 30 to 1, but perhaps 1 to 2: the lower end lies where few draws fall.
    UncertainProblem problem = known_priors({30.0, 1.0});
    problem.priors[0].law = engine::RangedPrior{std::log(0.5), std::log(1000.0), false};
    const PosteriorSpread spread = posterior_spread(UncertainPosterior(problem), {});
    EXPECT_GT(spread.draws, 16'384);
    EXPECT_LE(std::max(spread.low_error.maxCoeff(), spread.high_error.maxCoeff()), 0.005);
    EXPECT_NEAR(spread.leads.sum(), 1.0, 1e-12);
}

/// The stated error of an end is the scatter of that end over seeds.
TEST(PosteriorSpread, TheStatedErrorIsTheScatterOverSeeds) {
    const UncertainPosterior posterior(mixed_problem());
    constexpr int seeds = 60;
    Eigen::ArrayXd low(seeds);
    Eigen::ArrayXd stated(seeds);
    for (int seed = 0; seed < seeds; ++seed) {
        SpreadOptions options;
        options.draws = 3000;
        options.seed = static_cast<std::uint64_t>(seed);
        const PosteriorSpread spread = posterior_spread(posterior, options);
        low(seed) = spread.low(0);
        stated(seed) = spread.low_error(0);
    }
    const double scatter = std::sqrt((low - low.mean()).square().sum() / (seeds - 1));
    EXPECT_GT(stated.mean(), 0.7 * scatter);
    EXPECT_LT(stated.mean(), 1.4 * scatter);
}

TEST(PosteriorSpread, CausesThatTieShareADraw) {
    const UncertainProblem problem = known_priors({2.0, 2.0, 1.0});
    SpreadOptions options;
    options.draws = 1000;
    const PosteriorSpread spread = posterior_spread(UncertainPosterior(problem), options);
    EXPECT_EQ(spread.leads(0), 0.5);
    EXPECT_EQ(spread.leads(1), 0.5);
    EXPECT_EQ(spread.leads(2), 0.0);
}

TEST(PosteriorSpread, WithoutUncertaintyTheIntervalIsThePosterior) {
    UncertainProblem problem = known_priors({3.0, 1.0});
    const PosteriorSpread spread = posterior_spread(UncertainPosterior(problem), {});
    EXPECT_TRUE(near_rel(0.75, spread.low(0), 1e-14));
    EXPECT_TRUE(near_rel(0.75, spread.high(0), 1e-14));
    EXPECT_EQ(spread.leads(0), 1.0);
    EXPECT_GT(spread.leads_error(0), 0.0);
}

TEST(PosteriorSpread, ProgressIsToldAndRisesToOne) {
    SpreadOptions options;
    options.draws = 20'000;
    double last = 0.0;
    options.progress = [&](double done) {
        EXPECT_GE(done, last);
        last = done;
    };
    static_cast<void>(posterior_spread(UncertainPosterior(mixed_problem()), options));
    EXPECT_EQ(last, 1.0);
}

TEST(SampleQuantiles, AgreeWithASortedSample) {
    EXPECT_TRUE(rc::check([] {
        const auto size = *rc::gen::inRange<std::size_t>(2, 300);
        std::vector<double> sample = *rc::gen::container<std::vector<double>>(
            size, rc::gen::map(rc::gen::inRange(-50, 50), [](int i) { return i / 7.0; }));
        std::vector<double> sorted = sample;
        std::sort(sorted.begin(), sorted.end());
        const std::vector<double> levels = {0.025, 0.5, 0.975};
        const std::vector<engine::SampleQuantile> got = engine::sample_quantiles(sample, levels);
        for (std::size_t i = 0; i < levels.size(); ++i) {
            const double rank = levels[i] * static_cast<double>(size - 1);
            const auto whole = static_cast<std::size_t>(rank);
            const double next = sorted[std::min(whole + 1, size - 1)];
            const double wanted =
                sorted[whole] + (rank - static_cast<double>(whole)) * (next - sorted[whole]);
            RC_ASSERT(std::abs(got[i].value - wanted) < 1e-12);
            RC_ASSERT(got[i].error >= 0.0);
        }
    }));
}

TEST(UncertainPosterior, RefusesWhatHasNoMeaning) {
    const auto refused = [](const auto& change, const std::string& argument, Place place, double value,
                            const std::string& requirement) {
        UncertainProblem problem = mixed_problem();
        change(problem);
        expect_domain_error([&] { const UncertainPosterior refused_one(problem); }, "UncertainPosterior",
                            argument, place, value, requirement);
    };
    refused([](UncertainProblem& p) { p.weight(1) = 0.0; }, "weight", {1, {}}, 0.0, "> 0 and <= 1");
    refused([](UncertainProblem& p) { p.row_of(0, 1) = 99; }, "row_of", {0, 1}, 99.0, "the index of a row");
    refused([](UncertainProblem& p) { p.rows[1].stream = 0; }, "stream", {1, {}}, 0.0,
            "one that no other row has");
    refused([](UncertainProblem& p) { p.rows[2].cells = {}; }, "cells size", {2, {}}, 0.0, "at least 1");
    refused([](UncertainProblem& p) { p.rows[2].cells = {3}; }, "cell", {2, {}}, 3.0, "a band of its law");
    refused([](UncertainProblem& p) { p.rows[2].log_share = 0.1; }, "log_share", {2, {}}, 0.1,
            "finite and <= 0");
    refused([](UncertainProblem& p) { p.rows[2].least = 1.0; }, "least", {2, {}}, 1.0, "in [0, 1)");
    refused([](UncertainProblem& p) { p.rows[2].stream = 1U << 30U; }, "stream", {2, {}}, 0x1p30,
            "below 2^30");
    refused([](UncertainProblem& p) { p.rows[7].reference = 7; }, "reference", {7, {}}, 7.0,
            "an earlier row");
    refused([](UncertainProblem& p) { p.rows[5].reference = 0; }, "reference", {5, {}}, 0.0,
            "absent: only ratios are against another row");
    refused([](UncertainProblem& p) { p.priors[0].law = engine::CountedPrior{0.0}; }, "prior shape", {0, {}},
            0.0, "finite and > 0");
    refused(
        [](UncertainProblem& p) {
            p.priors[1].law = engine::RangedPrior{1.0, 2.0, false};
        },
        "prior log_low", {1, {}}, 1.0, "finite and not above the value");
}

TEST(UncertainPosterior, RefusesAnIntervalWithoutTails) {
    const UncertainPosterior posterior(mixed_problem());
    for (const double level : {0.0, 1.0, 1.0 - 0x1p-33}) {
        expect_domain_error([&] { static_cast<void>(posterior.row_interval(0, level)); },
                            "UncertainPosterior::row_interval", "level", {}, level, "in (0, 1 - 2^-31]");
    }
    EXPECT_LT(posterior.row_interval(0, 1.0 - 0x1p-31).low, posterior.row_interval(0).low);
}

TEST(PosteriorSpread, RefusesAbsurdOptions) {
    const UncertainPosterior posterior(mixed_problem());
    const auto refused = [&](const SpreadOptions& options, const std::string& argument, double value,
                             const std::string& requirement) {
        expect_domain_error([&] { static_cast<void>(posterior_spread(posterior, options)); },
                            "posterior_spread", argument, {}, value, requirement);
    };
    SpreadOptions options;
    options.draws = 999;
    refused(options, "draws", 999.0, "between 1000 and 1e+06");
    options = {};
    options.threads = 0;
    refused(options, "threads", 0.0, "between 1 and 256");
    options = {};
    options.level = 1.0;
    refused(options, "level", 1.0, "in (0, 1)");
}

}  // namespace
}  // namespace steelyard::test
