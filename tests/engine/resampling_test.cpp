// SPDX-License-Identifier: Apache-2.0
// The bootstrap on a table: the law of its draws, what is known exactly of its answers, and that threads
// change no bit.
#include <gtest/gtest.h>

#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <limits>

#include "audit_samples.hpp"
#include "binomial_sampler.hpp"
#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/audit.hpp"
#include "steelyard/engine/paired_comparison.hpp"
#include "steelyard/engine/resampling.hpp"

namespace steelyard::test {
namespace {

using engine::AuditSample;
using engine::BootstrapInterval;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

/// Chi-square of draws against the binomial law, outcomes with fewer than 10 expected joined; its p.
double binomial_fit(double trials, double p, const std::vector<double>& drawn) {
    std::vector<double> seen(static_cast<std::size_t>(trials) + 1, 0.0);
    for (const double x : drawn) {
        EXPECT_TRUE(x >= 0.0 && x <= trials && x == std::floor(x));
        seen[static_cast<std::size_t>(x)] += 1.0;
    }
    const boost::math::binomial law(trials, p);
    double chi2 = 0.0, joined = 0.0, expected = 0.0;
    int cells = 0;
    for (std::size_t x = 0; x < seen.size(); ++x) {
        joined += seen[x];
        expected += static_cast<double>(drawn.size()) * boost::math::pdf(law, static_cast<double>(x));
        if (expected >= 10.0) {
            chi2 += (joined - expected) * (joined - expected) / expected;
            ++cells;
            joined = expected = 0.0;
        }
    }
    return boost::math::cdf(boost::math::complement(boost::math::chi_squared(cells - 1), chi2));
}

TEST(BinomialSampler, FollowsTheBinomialLaw) {
    // Inversion below a mean of 10, rejection from there on, both mirrored above p = 1/2.
    for (const auto& [trials, p] : std::vector<std::pair<double, double>>{{1, 0.5},
                                                                          {7, 0.2},
                                                                          {12, 0.9},
                                                                          {400, 0.02},
                                                                          {19, 0.5},
                                                                          {20, 0.5},
                                                                          {30, 0.4},
                                                                          {30, 0.6},
                                                                          {1000, 0.0101},
                                                                          {1000, 0.3},
                                                                          {100000, 0.001},
                                                                          {100000, 0.7}}) {
        engine::BinomialSampler sampler(7, 0xc0000000U);
        std::vector<double> drawn;
        for (int i = 0; i < 40000; ++i) {
            drawn.push_back(sampler.draw(trials, p));
        }
        EXPECT_GT(binomial_fit(trials, p, drawn), 1e-4) << trials << " " << p;
    }
    engine::BinomialSampler sampler(7, 1);
    EXPECT_EQ(sampler.draw(0.0, 0.5), 0.0);
    EXPECT_EQ(sampler.draw(9.0, 0.0), 0.0);
    EXPECT_EQ(sampler.draw(9.0, 1.0), 9.0);
}

/// `drawn` column by column: replicates of one table.
Eigen::ArrayXXd replicates_of(const Eigen::ArrayXd& count, Eigen::Index replicates) {
    Eigen::ArrayXXd drawn(count.size(), replicates);
    for (Eigen::Index r = 0; r < replicates; ++r) {
        drawn.col(r) = engine::resample_counts(count, 9, r);
        EXPECT_EQ(drawn.col(r).sum(), count.sum());
    }
    return drawn;
}

TEST(ResampleCounts, FollowTheBinomialLawInEachCellAndInSumsOfCells) {
    // Few patients (one by one), many in small cells (independent first), and cells over 256 before them.
    Eigen::ArrayXd few = Eigen::ArrayXd::Constant(20, 2.0);
    few(3) = 9.0;
    Eigen::ArrayXd many = Eigen::ArrayXd::Constant(80, 5.0);
    many(3) = 60.0;
    many(7) = 1.0;
    Eigen::ArrayXd mixed = many;
    mixed(0) = 300.0;
    mixed(40) = 2000.0;
    for (const Eigen::ArrayXd& count : {few, many, mixed}) {
        const double n = count.sum();
        const Eigen::ArrayXXd drawn = replicates_of(count, 10000);
        const auto fit = [&](const Eigen::ArrayXd& values, double expected) {
            return binomial_fit(n, expected / n, {values.data(), values.data() + values.size()});
        };
        for (const Eigen::Index cell : {0, 3, 7, 19}) {
            EXPECT_GT(fit(drawn.row(cell).transpose(), count(cell)), 1e-4) << n << " cell " << cell;
        }
        EXPECT_GT(fit(drawn.topRows(15).colwise().sum().transpose(), count.head(15).sum()), 1e-4) << n;
    }
}

TEST(ResampleCounts, HasTheMomentsOfTheMultinomialLaw) {
    Eigen::ArrayXd count(6);
    count << 1, 0, 50, 3, 1200, 46;
    const double n = count.sum();
    const Eigen::Index replicates = 20000;
    Eigen::ArrayXXd drawn(6, replicates);
    for (Eigen::Index r = 0; r < replicates; ++r) {
        drawn.col(r) = engine::resample_counts(count, 3, r);
        ASSERT_EQ(drawn.col(r).sum(), n);
    }
    EXPECT_TRUE((drawn.row(1) == 0.0).all());
    for (Eigen::Index i = 0; i < 6; ++i) {
        for (Eigen::Index j = 0; j <= i; ++j) {
            const double mean_i = drawn.row(i).mean();
            const double mean_j = drawn.row(j).mean();
            const double covariance = ((drawn.row(i) - mean_i) * (drawn.row(j) - mean_j)).mean();
            const double want = i == j ? count(i) * (1.0 - count(i) / n) : -count(i) * count(j) / n;
            const double scale = std::sqrt(count(i) * count(j) * (1.0 - count(i) / n) * (1.0 - count(j) / n));
            EXPECT_NEAR(covariance, want, 6.0 * scale * std::sqrt(2.0 / 20000.0) + 1e-12) << i << " " << j;
        }
        EXPECT_NEAR(drawn.row(i).mean(), count(i), 5.0 * std::sqrt(count(i) / 20000.0) + 1e-12);
    }
}

TEST(ResampleCounts, DependOnSeedAndReplicateOnly) {
    const Eigen::ArrayXd count = Eigen::ArrayXd::LinSpaced(30, 0.0, 29.0);
    const Eigen::ArrayXd one = engine::resample_counts(count, 5, 11);
    EXPECT_TRUE((one == engine::resample_counts(count, 5, 11)).all());
    EXPECT_FALSE((one == engine::resample_counts(count, 6, 11)).all());
    EXPECT_FALSE((one == engine::resample_counts(count, 5, 12)).all());
}

TEST(PercentileInterval, InterpolatesBetweenOrderStatistics) {
    Eigen::ArrayXd values = Eigen::ArrayXd::LinSpaced(41, 0.0, 40.0).reverse();
    const BootstrapInterval got = engine::percentile_interval(values, 0.9).value();
    EXPECT_TRUE(near_rel(2.0, got.low, 1e-13));  // 0.05 of 40 steps
    EXPECT_TRUE(near_rel(38.0, got.high, 1e-13));
    EXPECT_TRUE(near_rel(std::sqrt(41.0 * 42.0 / 12.0), got.standard_error, 1e-13));
    EXPECT_EQ(got.replicates, 41);
    values.head(4).setConstant(nan);
    EXPECT_EQ(engine::percentile_interval(values).value().replicates, 37);
    values.head(5).setConstant(nan);  // 36 of 41 are under nine tenths
    EXPECT_FALSE(engine::percentile_interval(values).has_value());
}

/// The figures of an audit that have a bootstrap, in one list.
std::vector<double> flat(const engine::AuditIntervals& x) {
    std::vector<std::optional<BootstrapInterval>> all = {
        x.log_score, x.brier, x.log_skill, x.brier_skill,
        x.top_1,     x.top_2, x.hand_till, x.leader_calibration_error};
    for (const auto* list : {&x.area, &x.calibration_error, &x.intercept, &x.slope, &x.net_benefit}) {
        all.insert(all.end(), list->begin(), list->end());
    }
    std::vector<double> numbers;
    for (const auto& interval : all) {
        numbers.push_back(interval ? interval->low : -1e99);
        numbers.push_back(interval ? interval->high : -1e99);
        numbers.push_back(interval ? interval->standard_error : -1e99);
    }
    return numbers;
}

TEST(AuditIntervals, ChangeNoBitWithTheNumberOfThreads) {
    const AuditSample sample = made_sample(40, 3, 3.0, 4, 20);
    std::vector<std::vector<double>> got;
    for (const int threads : {1, 2, 5}) {
        engine::ResamplingOptions options;
        options.replicates = 150;
        options.threads = threads;
        got.push_back(flat(engine::audit_intervals(sample, options, 10, {{1, 0.4}})));
    }
    EXPECT_EQ(got[0], got[1]);
    EXPECT_EQ(got[0], got[2]);
    engine::ResamplingOptions other;
    other.replicates = 150;
    other.seed = 2;
    EXPECT_NE(got[0], flat(engine::audit_intervals(sample, other, 10, {{1, 0.4}})));
}

/// Each figure of each replicate, computed anew from the replicate as if it were a sample.
TEST(AuditIntervals, AreThoseOfEveryFigureComputedAnew) {
    const AuditSample sample = made_sample(60, 3, 3.0, 5, 21);
    engine::ResamplingOptions options;
    options.replicates = 60;
    const engine::AuditIntervals got = engine::audit_intervals(sample, options, 8, {{2, 0.25}});
    Eigen::ArrayXd cells((sample.count > 0.0).count());
    Eigen::Index at = 0;
    for (Eigen::Index g = 0; g < 60; ++g) {
        for (Eigen::Index k = 0; k < 3; ++k) {
            if (sample.count(g, k) > 0.0) {
                cells(at++) = sample.count(g, k);
            }
        }
    }
    Eigen::ArrayXXd figures(11, 60);
    for (Eigen::Index r = 0; r < 60; ++r) {
        const Eigen::ArrayXd drawn = engine::resample_counts(cells, options.seed, r);
        AuditSample replicate = sample;
        at = 0;
        for (Eigen::Index g = 0; g < 60; ++g) {
            for (Eigen::Index k = 0; k < 3; ++k) {
                replicate.count(g, k) = sample.count(g, k) > 0.0 ? drawn(at++) : 0.0;
            }
        }
        const engine::ProperScores scores = engine::proper_scores(replicate);
        const engine::TopCall calls = engine::top_call(replicate);
        figures.col(r) << scores.log_score, scores.brier, scores.log_skill, scores.brier_skill,
            calls.top[0].value, calls.top[1].value, engine::area_under_curve(replicate, 1)->value,
            *engine::pairwise_areas(replicate).hand_till,
            engine::reliability(replicate, 1, {.bins = 8, .draws = 20}).error.value,
            engine::leader_reliability(replicate, {.bins = 8, .draws = 20}).error.value,
            engine::net_benefit(replicate, 2, 0.25).value;
    }
    const std::vector<std::optional<BootstrapInterval>> want = {
        got.log_score,     got.brier,   got.log_skill, got.brier_skill,          got.top_1,
        got.top_2,         got.area[1], got.hand_till, got.calibration_error[1], got.leader_calibration_error,
        got.net_benefit[0]};
    for (std::size_t i = 0; i < want.size(); ++i) {
        const BootstrapInterval anew =
            engine::percentile_interval(figures.row(static_cast<Eigen::Index>(i)).transpose()).value();
        EXPECT_TRUE(near_rel(anew.low, want[i]->low, 1e-11)) << i;
        EXPECT_TRUE(near_rel(anew.high, want[i]->high, 1e-11)) << i;
        EXPECT_TRUE(near_rel(anew.standard_error, want[i]->standard_error, 1e-9)) << i;
    }
}

TEST(AuditIntervals, OfCoefficientsAreNearThoseOfEachReplicatesOwnFit) {
    AuditSample sample = made_sample(60, 2, 3.0, 3, 22);
    sample.count = (60.0 * sample.log_forecast.exp()).round();
    engine::ResamplingOptions options;
    options.replicates = 200;
    options.threads = 2;
    const engine::AuditIntervals got = engine::audit_intervals(sample, options);
    const engine::CauseCalibration fit = engine::cause_calibration(sample, 0);
    // The fit is right, so the bootstrap's spread is that of the information, but for 200 draws' own error.
    EXPECT_TRUE(near_rel(fit.cox->slope_error, got.slope[0]->standard_error, 0.2));
    EXPECT_TRUE(near_rel(fit.cox->intercept_error, got.intercept[0]->standard_error, 0.2));
    EXPECT_LT(got.slope[0]->low, fit.slope->value);
    EXPECT_GT(got.slope[0]->high, fit.slope->value);
}

TEST(AuditIntervals, HaveTheStandardErrorOfAMeanThatIsKnown) {
    const AuditSample sample = made_sample(50, 3, 3.0, 6, 23);
    const double n = sample.patients();
    const double mean = engine::proper_scores(sample).log_score;
    const double sd = std::sqrt((sample.count * (-sample.log_forecast - mean).square()).sum() / n);
    engine::ResamplingOptions options;
    options.replicates = 20000;
    options.threads = 2;
    const BootstrapInterval got = engine::audit_intervals(sample, options).log_score.value();
    EXPECT_TRUE(near_rel(sd / std::sqrt(n), got.standard_error, 5.0 / std::sqrt(40000.0)));
}

TEST(ComparePaired, OfAForecastWithItselfFindsNothing) {
    const AuditSample sample = made_sample(30, 3, 3.0, 3, 24);
    engine::ResamplingOptions options;
    options.replicates = 50;
    const engine::PairedComparison got =
        engine::compare_paired({sample.log_forecast, sample.log_forecast, sample.count}, options);
    EXPECT_EQ(got.log_score.difference, 0.0);
    EXPECT_FALSE(got.log_score.t.has_value());
    EXPECT_EQ(got.log_score.interval->high, 0.0);
    EXPECT_EQ(got.hand_till->difference, 0.0);
    EXPECT_FALSE(got.area[0]->z.has_value());
    EXPECT_EQ(got.top_1.first, engine::top_call(sample).top[0].value);
}

TEST(ComparePaired, ChangesItsSignWithTheOrder) {
    const AuditSample sample = made_sample(30, 3, 3.0, 3, 25);
    const Eigen::ArrayXXd other =
        normalised(0.5 * sample.log_forecast + made_sample(30, 3, 1.0, 3, 26).log_forecast);
    engine::ResamplingOptions options;
    options.replicates = 200;
    const engine::PairedComparison one =
        engine::compare_paired({sample.log_forecast, other, sample.count}, options);
    const engine::PairedComparison back =
        engine::compare_paired({other, sample.log_forecast, sample.count}, options);
    EXPECT_TRUE(near_rel(-one.log_score.difference, back.log_score.difference, 1e-12));
    EXPECT_TRUE(near_rel(-one.brier.interval->low, back.brier.interval->high, 1e-12));
    EXPECT_TRUE(near_rel(-one.area[2]->z.value(), back.area[2]->z.value(), 1e-11));
    EXPECT_TRUE(near_rel(-one.hand_till->interval->low, back.hand_till->interval->high, 1e-11));
    EXPECT_TRUE(near_rel(one.top_1.standard_error.value(), back.top_1.standard_error.value(), 1e-13));
    EXPECT_EQ(one.hand_till->first, engine::pairwise_areas(sample).hand_till.value());
}

TEST(Resampling, RefusesBadArguments) {
    const Eigen::ArrayXd count = Eigen::ArrayXd::Constant(3, 2.0);
    for (const double bad : {-1.0, 0.5, nan, infinity, 2147483648.0}) {
        Eigen::ArrayXd wrong = count;
        wrong(1) = bad;
        expect_domain_error([&] { static_cast<void>(engine::resample_counts(wrong, 1, 0)); },
                            "resample_counts", "count", {1, {}}, bad, "whole, >= 0 and below 2^31");
    }
    expect_domain_error([&] { static_cast<void>(engine::resample_counts(0.0 * count, 1, 0)); },
                        "resample_counts", "count sum", {}, 0, "at least 1 and below 2^31");
    expect_domain_error([&] { static_cast<void>(engine::resample_counts(Eigen::ArrayXd(), 1, 0)); },
                        "resample_counts", "count size", {}, 0, "at least 1");
    for (const Eigen::Index bad : {Eigen::Index{-1}, Eigen::Index{268435456}}) {
        EXPECT_THROW(static_cast<void>(engine::resample_counts(count, 1, bad)), engine::DomainError);
    }
    AuditSample sample = made_sample(5, 3, 1.0, 3, 27);
    const auto refused = [&](const engine::ResamplingOptions& options) {
        EXPECT_THROW(static_cast<void>(engine::audit_intervals(sample, options)), engine::DomainError);
        EXPECT_THROW(static_cast<void>(engine::compare_paired(
                         {sample.log_forecast, sample.log_forecast, sample.count}, options)),
                     engine::DomainError);
    };
    refused({.replicates = 19});
    refused({.replicates = Eigen::Index{1} << 28});
    refused({.threads = 0});
    refused({.level = 1.0});
    EXPECT_THROW(static_cast<void>(engine::audit_intervals(sample, {}, 0)), engine::DomainError);
    EXPECT_THROW(static_cast<void>(engine::audit_intervals(sample, {}, 10, {{3, 0.5}})), engine::DomainError);
    EXPECT_THROW(static_cast<void>(engine::audit_intervals(sample, {}, 10, {{0, 0.0}})), engine::DomainError);
    sample.count(0, 0) = 0.5;
    refused({});
}

}  // namespace
}  // namespace steelyard::test
