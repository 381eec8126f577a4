// SPDX-License-Identifier: Apache-2.0
// Figures of an audit: what must hold for any sample, small cases worked by hand, and what cannot be
// estimated.
#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "audit_samples.hpp"
#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/audit.hpp"
#include "steelyard/engine/score_chart.hpp"
#include "steelyard/engine/tempering.hpp"

namespace steelyard::test {
namespace {

using engine::AuditFigures;
using engine::AuditSample;
using engine::FitStatus;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

AuditFigures figures(const AuditSample& sample) {
    engine::AuditOptions options;
    options.replicates = 0;
    options.thresholds = {{0, 0.3}};
    return engine::audit(sample, options);
}

/// p_1 of two causes, and how many patients had causes 0 and 1.
AuditSample two_causes(const std::vector<std::array<double, 3>>& rows) {
    const auto size = static_cast<Eigen::Index>(rows.size());
    AuditSample sample{Eigen::ArrayXXd(size, 2), Eigen::ArrayXXd(size, 2)};
    for (Eigen::Index g = 0; g < size; ++g) {
        const auto& [p, without, with] = rows[static_cast<std::size_t>(g)];
        sample.log_forecast.row(g) << std::log1p(-p), std::log(p);
        sample.count.row(g) << without, with;
    }
    return sample;
}

/// The figures that do not name a cause, and those of cause `at`, in one list.
std::vector<double> listed(const AuditFigures& f, Eigen::Index at) {
    const engine::CauseFigures& cause = f.cause[static_cast<std::size_t>(at)];
    const engine::CallAccuracy& call = f.calls.cause[static_cast<std::size_t>(at)];
    const auto share = [](const std::optional<engine::IntervalEstimate>& x) { return x ? x->value : nan; };
    return {f.scores.log_score,
            f.scores.brier,
            f.scores.log_skill,
            f.scores.expected_log_score,
            f.scores.expected_brier,
            f.calls.top[0].value,
            f.calls.top[1].value,
            f.pairs.hand_till.value_or(nan),
            f.leader.error.value,
            f.spiegelhalter ? f.spiegelhalter->z / std::sqrt(f.patients) : nan,
            f.log_score_test ? f.log_score_test->z / std::sqrt(f.patients) : nan,
            f.temperature.exponent ? f.temperature.exponent->value : nan,
            f.recalibration.loglik / f.patients,
            f.recalibration.intercepts_loglik / f.patients,
            share(call.sensitivity),
            share(call.specificity),
            share(call.positive_predictive_value),
            share(call.negative_predictive_value),
            cause.area ? cause.area->value : nan,
            cause.calibration.cox ? cause.calibration.cox->slope : nan,
            cause.calibration.cox ? cause.calibration.cox->intercept : nan,
            share(cause.calibration.in_the_large),
            cause.spiegelhalter ? cause.spiegelhalter->z / std::sqrt(f.patients) : nan,
            cause.by_forecast.reliability,
            cause.by_forecast.resolution,
            cause.by_bin.reliability,
            cause.by_bin.within_bin_covariance,
            cause.reliability.error.value};
}

void expect_same(const std::vector<double>& want, const std::vector<double>& got, double tolerance) {
    for (std::size_t i = 0; i < want.size(); ++i) {
        EXPECT_TRUE(near_abs(want[i], got[i], tolerance * (1.0 + std::abs(want[i])))) << "figure " << i;
    }
}

// ---- properties ----

TEST(Audit, DoesNotDependOnTheOrderOfCauses) {
    for (const std::uint64_t seed : {1U, 2U, 3U}) {
        const AuditSample sample = made_sample(25, 4, 5.0, 3, seed);
        const Eigen::Index to[4] = {2, 0, 3, 1};
        AuditSample moved = sample;
        for (Eigen::Index k = 0; k < 4; ++k) {
            moved.log_forecast.col(to[k]) = sample.log_forecast.col(k);
            moved.count.col(to[k]) = sample.count.col(k);
        }
        const AuditFigures one = figures(sample);
        const AuditFigures other = figures(moved);
        for (Eigen::Index k = 0; k < 4; ++k) {
            expect_same(listed(one, k), listed(other, to[k]), 1e-9);
            for (Eigen::Index j = 0; j < 4; ++j) {
                EXPECT_EQ(one.calls.confusion(k, j), other.calls.confusion(to[k], to[j]));
                EXPECT_TRUE(near_rel(one.pairs.area(k, j), other.pairs.area(to[k], to[j]), 1e-13));
            }
        }
    }
}

TEST(Audit, DoesNotDependOnHowPatientsWithOneForecastAreSplit) {
    for (const std::uint64_t seed : {4U, 5U}) {
        const AuditSample sample = made_sample(20, 3, 4.0, 4, seed);
        AuditSample split{Eigen::ArrayXXd(41, 3), Eigen::ArrayXXd(41, 3)};
        split.log_forecast << sample.log_forecast, sample.log_forecast.colwise().reverse(),
            sample.log_forecast.row(7);
        const Eigen::ArrayXXd half = (sample.count / 2.0).floor();
        split.count << half, (sample.count - half).colwise().reverse(), Eigen::ArrayXXd::Zero(1, 3);
        const AuditFigures one = figures(sample);
        const AuditFigures other = figures(split);
        for (Eigen::Index k = 0; k < 3; ++k) {
            expect_same(listed(one, k), listed(other, k), 1e-9);
            EXPECT_TRUE(near_rel(*one.cause[static_cast<std::size_t>(k)].area->variance,
                                 *other.cause[static_cast<std::size_t>(k)].area->variance, 1e-12));
        }
        EXPECT_TRUE(near_rel(one.leader.error.expected_if_calibrated,
                             other.leader.error.expected_if_calibrated, 1e-12));
    }
}

TEST(Audit, KeepsItsPointValuesWhenEveryCountIsMultiplied) {
    const AuditSample sample = made_sample(30, 3, 4.0, 2, 6);
    AuditSample many = sample;
    many.count *= 7.0;
    const AuditFigures one = figures(sample);
    const AuditFigures other = figures(many);
    for (Eigen::Index k = 0; k < 3; ++k) {
        expect_same(listed(one, k), listed(other, k), 1e-9);
    }
    EXPECT_LT(other.cause[0].calibration.cox->slope_error, one.cause[0].calibration.cox->slope_error);
}

TEST(Audit, FindsForecastsCalibratedThatAreSoByConstruction) {
    AuditSample sample = made_sample(40, 4, 5.0, 3, 7);
    sample.count = sample.log_forecast.exp().colwise() * Eigen::ArrayXd::LinSpaced(40, 1.0, 40.0);
    const AuditFigures got = figures(sample);
    EXPECT_TRUE(near_rel(got.scores.expected_brier, got.scores.brier, 1e-13));
    EXPECT_TRUE(near_rel(got.scores.expected_log_score, got.scores.log_score, 1e-13));
    EXPECT_NEAR(got.spiegelhalter->z, 0.0, 1e-11);
    EXPECT_NEAR(got.log_score_test->z, 0.0, 1e-11);
    EXPECT_NEAR(got.temperature.exponent->value, 1.0, 1e-11);
    EXPECT_NEAR(got.leader.error.value, 0.0, 1e-12);
    EXPECT_NEAR(got.recalibration.intercept.abs().maxCoeff(), 0.0, 1e-9);
    Eigen::ArrayXXd identity = Eigen::ArrayXXd::Zero(3, 4);
    identity.rightCols(3).matrix().setIdentity();
    EXPECT_NEAR((got.recalibration.coefficient - identity).abs().maxCoeff(), 0.0, 1e-8);
    for (const engine::CauseFigures& cause : got.cause) {
        EXPECT_NEAR(cause.calibration.cox->slope, 1.0, 1e-9);
        EXPECT_NEAR(cause.calibration.cox->intercept, 0.0, 1e-9);
        EXPECT_NEAR(cause.calibration.in_the_large->value, 0.0, 1e-12);
        EXPECT_NEAR(cause.spiegelhalter->z, 0.0, 1e-11);
        EXPECT_NEAR(cause.by_forecast.reliability, 0.0, 1e-15);
        EXPECT_NEAR(cause.reliability.error.value, 0.0, 1e-12);
    }
}

TEST(Audit, FindsTheExponentThatWasAppliedToCalibratedForecasts) {
    AuditSample sample = made_sample(40, 3, 3.0, 3, 8);
    sample.count = sample.log_forecast.exp() * 50.0;
    sample.log_forecast = normalised(2.5 * sample.log_forecast);  // too sure
    const AuditFigures got = figures(sample);
    EXPECT_NEAR(got.temperature.exponent->value, 0.4, 1e-11);
    EXPECT_GT(got.spiegelhalter->z, 5.0);
    Eigen::ArrayXXd scaled = Eigen::ArrayXXd::Zero(2, 3);
    scaled(0, 1) = scaled(1, 2) = 0.4;
    EXPECT_NEAR((got.recalibration.coefficient - scaled).abs().maxCoeff(), 0.0, 1e-8);
}

TEST(Audit, DecomposesTheBrierScoreWithoutRest) {
    EXPECT_TRUE(rc::check([](std::uint64_t seed) {
        const AuditSample sample = made_sample(12, 3, 4.0, 3, seed);
        for (Eigen::Index k = 0; k < 3; ++k) {
            const engine::BrierDecomposition exact = engine::brier_by_forecast(sample, k);
            RC_ASSERT(near_abs(exact.brier, exact.reliability - exact.resolution + exact.uncertainty, 1e-14));
            const engine::BrierDecomposition binned = engine::brier_by_bin(sample, k, 4);
            RC_ASSERT(near_abs(binned.brier,
                               binned.reliability - binned.resolution + binned.uncertainty +
                                   binned.within_bin_variance - binned.within_bin_covariance,
                               1e-14));
        }
    }));
}

/// Patient against patient, as areas are defined.
double area_by_pairs(const AuditSample& sample, Eigen::Index i, const std::vector<Eigen::Index>& others) {
    const Eigen::ArrayXd x = engine::log_odds_against_rest(sample, i);
    double wins = 0.0;
    double pairs = 0.0;
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        for (Eigen::Index h = 0; h < sample.patterns(); ++h) {
            for (const Eigen::Index j : others) {
                const double weight = sample.count(g, i) * sample.count(h, j);
                const bool equal = std::abs(x(g) - x(h)) < 1e-11;
                wins += weight * (equal ? 0.5 : x(g) > x(h) ? 1.0 : 0.0);
                pairs += weight;
            }
        }
    }
    return wins / pairs;
}

TEST(Areas, AreWhatComparingAllPairsOfPatientsGives) {
    EXPECT_TRUE(rc::check([](std::uint64_t seed) {
        AuditSample sample = made_sample(14, 3, 3.0, 2, seed);
        for (Eigen::Index g = 9; g < 14; ++g) {  // ties, two of them under another order of the other causes
            sample.log_forecast.row(g) = sample.log_forecast.row(g - 5);
        }
        sample.log_forecast.row(13).tail(2).reverseInPlace();
        const engine::PairwiseAreas pairs = engine::pairwise_areas(sample);
        const Eigen::ArrayXd cases = sample.cause_counts();
        for (Eigen::Index i = 0; i < 3; ++i) {
            std::vector<Eigen::Index> others;
            for (Eigen::Index j = 0; j < 3; ++j) {
                if (j == i) {
                    continue;
                }
                others.push_back(j);
                if (cases(i) > 0.0 && cases(j) > 0.0) {
                    RC_ASSERT(near_rel(area_by_pairs(sample, i, {j}), pairs.area(i, j), 1e-13));
                } else {
                    RC_ASSERT(std::isnan(pairs.area(i, j)));
                }
            }
            const auto area = engine::area_under_curve(sample, i);
            if (area) {
                RC_ASSERT(near_rel(area_by_pairs(sample, i, others), area->value, 1e-13));
            }
        }
    }));
}

TEST(Temperature, AgreesWithTemperingOfFlatPriors) {
    const AuditSample sample = made_sample(20, 3, 3.0, 2, 9);
    engine::LabelledEvidence evidence;
    const Eigen::Index cells = (sample.count > 0.0).count();
    evidence.log_prior = Eigen::ArrayXd::Zero(3);
    evidence.loglik.resize(cells, 3);
    evidence.cause.resize(cells);
    evidence.count.resize(cells);
    Eigen::Index at = 0;
    for (Eigen::Index g = 0; g < 20; ++g) {
        for (Eigen::Index k = 0; k < 3; ++k) {
            if (sample.count(g, k) > 0.0) {
                evidence.loglik.row(at) = sample.log_forecast.row(g);
                evidence.cause(at) = static_cast<int>(k);
                evidence.count(at++) = sample.count(g, k);
            }
        }
    }
    const engine::TemperatureFit got = engine::temperature(sample);
    const engine::TemperingFit want = engine::fit_tempering(evidence);
    if (want.tau > 0.0) {
        EXPECT_TRUE(near_rel(want.tau, got.exponent->value, 1e-10));
        EXPECT_TRUE(near_rel(want.standard_error, got.standard_error.value(), 1e-9));
    } else {
        EXPECT_EQ(got.exponent->value, 0.0);
    }
    EXPECT_TRUE(near_rel(want.loglik, got.loglik, 1e-12));
}

// ---- by hand ----

TEST(LogOdds, KeepTheirDigitsWhereOneMinusPDoesNot) {
    AuditSample sample{normalised((Eigen::ArrayXXd(1, 3) << 0.0, -60.0, -61.0).finished()),
                       Eigen::ArrayXXd::Ones(1, 3)};
    const double others = -60.0 + std::log1p(std::exp(-1.0));
    EXPECT_TRUE(near_rel(-others, engine::log_odds_against_rest(sample, 0)(0), 1e-15));
    EXPECT_TRUE(near_rel(-60.0, engine::log_odds_against_rest(sample, 1)(0), 1e-15));
}

TEST(TopCall, GivesTiesToTheEarlierCause) {
    AuditSample sample{Eigen::ArrayXXd(2, 3), Eigen::ArrayXXd(2, 3)};
    sample.log_forecast << std::log(0.4), std::log(0.4), std::log(0.2), std::log(0.2), std::log(0.4),
        std::log(0.4);
    sample.count << 1, 2, 4, 8, 16, 32;
    const engine::TopCall got = engine::top_call(sample);
    EXPECT_EQ(got.top[0].value, (1.0 + 16.0) / 63.0);
    EXPECT_EQ(got.top[1].value, (1.0 + 2.0 + 16.0 + 32.0) / 63.0);
    EXPECT_EQ(got.top[2].value, 1.0);
    EXPECT_EQ(got.confusion(1, 0), 2.0);
    EXPECT_EQ(got.confusion(2, 1), 32.0);
    EXPECT_FALSE(got.cause[2].positive_predictive_value.has_value());  // nobody was called so
    EXPECT_EQ(got.cause[2].sensitivity->value, 0.0);
}

TEST(Reliability, PutsDecimalEdgesIntoTheUpperBin) {
    std::vector<std::array<double, 3>> rows;
    for (int i = 1; i < 100; ++i) {
        rows.push_back({static_cast<double>(i) / 100.0, 1.0, 1.0});
    }
    const engine::Reliability got = engine::reliability(two_causes(rows), 1, {.bins = 100});
    ASSERT_EQ(got.bins.size(), 99U);
    for (std::size_t i = 0; i < 99; ++i) {
        EXPECT_EQ(got.bins[i].index, static_cast<Eigen::Index>(i) + 1);
    }
    AuditSample certain = two_causes({{0.5, 1.0, 1.0}});
    certain.log_forecast << -800.0, 0.0;  // p = 1 in binary
    EXPECT_EQ(engine::reliability(certain, 1).bins.at(0).index, 9);
    EXPECT_EQ(engine::reliability(certain, 0).bins.at(0).index, 0);
}

TEST(Reliability, KnowsWhatCalibratedForecastsWouldShow) {
    // 5 patients at 0.3 and 3 at 0.8: E|X - 1.5| and E|Y - 2.4|, summed by hand over both laws.
    const engine::Reliability got =
        engine::reliability(two_causes({{0.3, 3.0, 2.0}, {0.8, 1.0, 2.0}}), 1, {.draws = 200000});
    double want = 0.0;
    const auto mass = [](double n, double p, double x) {
        return std::tgamma(n + 1) / std::tgamma(x + 1) / std::tgamma(n - x + 1) * std::pow(p, x) *
               std::pow(1 - p, n - x);
    };
    std::vector<std::pair<double, double>> joint;
    for (double x = 0; x <= 5; ++x) {
        want += mass(5, 0.3, x) * std::abs(x - 1.5) / 8.0;
        for (double y = 0; y <= 3; ++y) {
            joint.emplace_back((std::abs(x - 1.5) + std::abs(y - 2.4)) / 8.0,
                               mass(5, 0.3, x) * mass(3, 0.8, y));
        }
    }
    for (double y = 0; y <= 3; ++y) {
        want += mass(3, 0.8, y) * std::abs(y - 2.4) / 8.0;
    }
    EXPECT_TRUE(near_rel(want, got.error.expected_if_calibrated, 1e-13));
    std::sort(joint.begin(), joint.end());
    double reached = 0.0;
    std::size_t at = 0;
    while ((reached += joint[at].second) < 0.95) {
        ++at;
    }
    EXPECT_NEAR(joint[at].first, got.error.percentile_95_if_calibrated, 1e-12);
}

TEST(Reliability, PassesFromTheExactLawToTheNormalOneWithoutAStep) {
    // Variances of 99.96 and 100.17 on either side of the limit of 100.
    const auto expected = [](double patients) {
        return engine::reliability(two_causes({{0.3, patients, 0.0}}), 1).error.expected_if_calibrated *
               patients / std::sqrt(patients);
    };
    EXPECT_TRUE(near_rel(expected(476.0), expected(477.0), 2e-3));
    EXPECT_TRUE(near_rel(expected(477.0), expected(1000000.0), 1e-12));
}

TEST(NetBenefit, IsCountedByHand) {
    const AuditSample sample = two_causes({{0.1, 6.0, 1.0}, {0.2, 3.0, 2.0}, {0.7, 1.0, 7.0}});
    const engine::NetBenefit got = engine::net_benefit(sample, 1, 0.2);  // 0.2 itself is treated
    EXPECT_TRUE(near_rel(9.0 / 20.0 - 4.0 / 20.0 * 0.25, got.value, 1e-14));
    EXPECT_TRUE(near_rel(0.5 - 0.5 * 0.25, got.treat_all, 1e-14));
    EXPECT_TRUE(near_rel(13.0 / 20.0, got.treated, 1e-15));
}

TEST(ScoreChart, FlagsThePeriodThatIsOutside) {
    const AuditSample usual = two_causes({{0.2, 40.0, 10.0}, {0.7, 15.0, 35.0}});
    const AuditSample worse = two_causes({{0.2, 10.0, 40.0}, {0.7, 35.0, 15.0}});
    AuditSample none = usual;
    none.count.setZero();
    const engine::ScoreChart chart = engine::score_chart({usual, usual, none, usual, usual, worse});
    ASSERT_EQ(chart.periods.size(), 6U);
    const double score = engine::proper_scores(usual).log_score;
    EXPECT_TRUE(near_rel(score, chart.periods[0].log_score.value(), 1e-14));
    EXPECT_TRUE(
        near_rel(engine::proper_scores(usual).expected_log_score, chart.periods[0].expected.value(), 1e-14));
    EXPECT_TRUE(near_rel(engine::log_score_test(usual)->z, *chart.periods[0].z_against_expected, 1e-12));
    EXPECT_TRUE(near_rel((4.0 * score + engine::proper_scores(worse).log_score) / 5.0, chart.mean, 1e-14));
    // 250 and 250 patients' scores by kind: -ln 0.8, -ln 0.2, -ln 0.3, -ln 0.7.
    const double mean = chart.mean;
    const double square =
        170.0 * std::pow(-std::log(0.8) - mean, 2) + 80.0 * std::pow(-std::log(0.2) - mean, 2) +
        95.0 * std::pow(-std::log(0.3) - mean, 2) + 155.0 * std::pow(-std::log(0.7) - mean, 2);
    EXPECT_TRUE(near_rel(std::sqrt(square / 499.0), chart.sd, 1e-13));
    EXPECT_TRUE(near_rel(mean + 3.0 * chart.sd / 10.0, chart.periods[0].high.value(), 1e-14));
    EXPECT_EQ(chart.periods[2].patients, 0.0);
    EXPECT_FALSE(chart.periods[2].log_score.has_value());
    for (std::size_t t = 0; t < 5; ++t) {
        EXPECT_FALSE(chart.periods[t].outside);
    }
    EXPECT_TRUE(chart.periods[5].outside);
    EXPECT_FALSE(engine::score_chart({usual}).periods[0].outside);
}

// ---- what cannot be estimated ----

TEST(Audit, OfOnePatientSaysWhatItCannotTell) {
    engine::AuditOptions options;
    options.replicates = 50;
    options.thresholds = {{1, 0.2}};
    const AuditFigures got = engine::audit(two_causes({{0.3, 0.0, 1.0}}), options);
    EXPECT_TRUE(near_rel(-std::log(0.3), got.scores.log_score, 1e-15));
    EXPECT_TRUE(std::isnan(got.scores.brier_skill));
    EXPECT_FALSE(got.cause[0].area.has_value());
    EXPECT_FALSE(got.pairs.hand_till.has_value());
    EXPECT_EQ(got.pairs.pairs, 0);
    EXPECT_EQ(got.cause[0].calibration.status, FitStatus::no_case);
    EXPECT_EQ(got.cause[1].calibration.status, FitStatus::only_cases);
    EXPECT_FALSE(got.cause[1].calibration.in_the_large.has_value());
    EXPECT_EQ(got.recalibration.status, FitStatus::no_case);
    EXPECT_EQ(got.recalibration.intercepts_status, FitStatus::no_case);
    EXPECT_EQ(got.temperature.exponent->value, 0.0);
    EXPECT_FALSE(got.calls.cause[0].sensitivity.has_value());
    ASSERT_TRUE(got.intervals.has_value());
    EXPECT_FALSE(got.intervals->area[0].has_value());
    EXPECT_FALSE(got.intervals->slope[0].has_value());
    EXPECT_FALSE(got.intervals->hand_till.has_value());
    EXPECT_FALSE(got.intervals->brier_skill.has_value());
    EXPECT_EQ(got.intervals->log_score->low, got.intervals->log_score->high);
}

TEST(Audit, WorksWithoutACauseThatNobodyHas) {
    AuditSample sample = made_sample(20, 3, 3.0, 3, 10);
    sample.count.col(2).setZero();
    const AuditFigures got = figures(sample);
    EXPECT_EQ(got.pairs.pairs, 1);
    EXPECT_TRUE(
        near_rel(0.5 * (got.pairs.area(0, 1) + got.pairs.area(1, 0)), got.pairs.hand_till.value(), 1e-14));
    EXPECT_EQ(got.recalibration.status, FitStatus::no_case);
    EXPECT_TRUE(got.recalibration.intercept.size() == 0);
    EXPECT_TRUE(got.cause[0].calibration.cox.has_value());
}

TEST(Calibration, OfForecastsThatSortTheOutcomesIsSeparated) {
    const AuditSample sample =
        two_causes({{0.1, 5.0, 0.0}, {0.3, 2.0, 0.0}, {0.6, 0.0, 2.0}, {0.8, 0.0, 4.0}});
    const AuditFigures got = figures(sample);
    EXPECT_EQ(got.cause[1].calibration.status, FitStatus::separated);
    EXPECT_FALSE(got.cause[1].calibration.cox || got.cause[1].calibration.slope);
    EXPECT_TRUE(got.cause[1].calibration.in_the_large.has_value());
    EXPECT_EQ(got.recalibration.status, FitStatus::separated);
    EXPECT_EQ(got.recalibration.intercepts_status, FitStatus::found);
    EXPECT_EQ(got.temperature.status, FitStatus::separated);
    EXPECT_FALSE(got.temperature.exponent.has_value());
    EXPECT_EQ(got.cause[1].area->value, 1.0);
    EXPECT_FALSE(got.cause[1].area->variance || got.cause[1].area->interval);
}

TEST(Calibration, OfOneForecastForAllIsConstant) {
    const AuditSample sample = two_causes({{0.3, 5.0, 4.0}, {0.3, 2.0, 0.0}});
    const AuditFigures got = figures(sample);
    EXPECT_EQ(got.cause[1].calibration.status, FitStatus::constant_forecast);
    EXPECT_EQ(got.recalibration.status, FitStatus::constant_forecast);
    EXPECT_TRUE(near_rel(std::log(4.0 / 7.0) - std::log(0.3 / 0.7),
                         got.cause[1].calibration.in_the_large->value, 1e-12));
    EXPECT_EQ(got.cause[1].area->value, 0.5);
    EXPECT_EQ(engine::temperature(two_causes({{0.5, 5.0, 4.0}})).status, FitStatus::constant_forecast);
}

TEST(Recalibration, IsNotOfferedForVeryManyCauses) {
    const AuditSample sample = made_sample(60, 25, 3.0, 2, 11);
    const engine::Recalibration got = engine::recalibrate(sample);
    EXPECT_EQ(got.status, FitStatus::too_many_causes);
    EXPECT_EQ(got.intercepts_status, FitStatus::found);
}

TEST(Recalibration, FitsAlikeWhateverItsReference) {
    const AuditSample sample = made_sample(40, 3, 3.0, 4, 12);
    const engine::Recalibration one = engine::recalibrate(sample, 0);
    for (const Eigen::Index reference : {1, 2}) {
        const engine::Recalibration other = engine::recalibrate(sample, reference);
        EXPECT_TRUE(near_rel(one.loglik, other.loglik, 1e-12));
        EXPECT_TRUE(near_rel(one.intercepts_loglik, other.intercepts_loglik, 1e-12));
        EXPECT_EQ(other.reference, reference);
    }
}

// ---- errors ----

TEST(AuditSample, RefusesWhatIsNoSample) {
    const AuditSample good = two_causes({{0.3, 5.0, 4.0}, {0.6, 2.0, 3.0}});
    const auto refused = [](AuditSample sample, const std::string& argument, Place place, double value,
                            const std::string& requirement) {
        expect_domain_error([&] { engine::check_audit_sample("audit", sample); }, "audit", argument, place,
                            value, requirement);
        expect_domain_error([&] { static_cast<void>(engine::audit(sample)); }, "audit", argument, place,
                            value, requirement);
    };
    refused({Eigen::ArrayXXd(0, 2), Eigen::ArrayXXd(0, 2)}, "log_forecast rows size", {}, 0, "at least 1");
    refused({Eigen::ArrayXXd::Zero(1, 1), Eigen::ArrayXXd::Ones(1, 1)}, "log_forecast columns size", {}, 1,
            "at least 2");
    refused({good.log_forecast, Eigen::ArrayXXd::Ones(1, 2)}, "count rows size", {}, 1, "2");
    refused({good.log_forecast, Eigen::ArrayXXd::Ones(2, 3)}, "count columns size", {}, 3, "2");
    for (const double bad : {nan, infinity, -infinity}) {
        AuditSample sample = good;
        sample.log_forecast(1, 0) = bad;
        refused(sample, "log_forecast", {1, 0}, bad, "finite");
    }
    for (const double bad : {nan, infinity, -1.0}) {
        AuditSample sample = good;
        sample.count(0, 1) = bad;
        refused(sample, "count", {0, 1}, bad, "finite and >= 0");
    }
    AuditSample sample = good;
    sample.log_forecast.row(1) << std::log(0.5), std::log(0.25);
    refused(sample, "log_forecast sum of exp", {1, {}}, 0.75, "1 within 1e-9");
    sample = good;
    sample.count.setZero();
    refused(sample, "count sum", {}, 0.0, "finite and > 0");
}

TEST(AuditFunctions, RefuseBadArguments) {
    const AuditSample sample = two_causes({{0.3, 5.0, 4.0}, {0.6, 2.0, 3.0}});
    for (const Eigen::Index bad : {-1, 2}) {
        const auto value = static_cast<double>(bad);
        const auto refused = [&](const std::string& function, const auto& call) {
            expect_domain_error([&] { static_cast<void>(call()); }, function, "cause", {}, value,
                                "between 0 and 1");
        };
        refused("brier_by_forecast", [&] { return engine::brier_by_forecast(sample, bad); });
        refused("brier_by_bin", [&] { return engine::brier_by_bin(sample, bad); });
        refused("area_under_curve", [&] { return engine::area_under_curve(sample, bad); });
        refused("cause_calibration", [&] { return engine::cause_calibration(sample, bad); });
        refused("spiegelhalter_test", [&] { return engine::spiegelhalter_test(sample, bad); });
        refused("reliability", [&] { return engine::reliability(sample, bad); });
        refused("net_benefit", [&] { return engine::net_benefit(sample, bad, 0.5); });
        refused("log_odds_against_rest", [&] { return engine::log_odds_against_rest(sample, bad); });
        expect_domain_error([&] { static_cast<void>(engine::recalibrate(sample, bad)); }, "recalibrate",
                            "reference", {}, value, "between 0 and 1");
    }
    for (const Eigen::Index bad : {0, 1001}) {
        const auto value = static_cast<double>(bad);
        expect_domain_error([&] { static_cast<void>(engine::brier_by_bin(sample, 0, bad)); }, "brier_by_bin",
                            "bins", {}, value, "between 1 and 1000");
        expect_domain_error([&] { static_cast<void>(engine::reliability(sample, 0, {.bins = bad})); },
                            "reliability", "bins", {}, value, "between 1 and 1000");
    }
    expect_domain_error([&] { static_cast<void>(engine::leader_reliability(sample, {.draws = 19})); },
                        "leader_reliability", "draws", {}, 19, "between 20 and 1e+07");
    for (const double bad : {0.0, 1.0, nan}) {
        expect_domain_error([&] { static_cast<void>(engine::net_benefit(sample, 0, bad)); }, "net_benefit",
                            "threshold", {}, bad, "between 1e-06 and 0.999999");
        const auto refused = [&](const auto& call) {
            EXPECT_THROW(static_cast<void>(call()), engine::DomainError);
        };
        refused([&] { return engine::top_call(sample, bad); });
        refused([&] { return engine::area_under_curve(sample, 0, bad); });
        refused([&] { return engine::cause_calibration(sample, 0, bad); });
        refused([&] { return engine::temperature(sample, bad); });
        refused([&] { return engine::leader_reliability(sample, {.level = bad}); });
    }
    expect_domain_error([] { static_cast<void>(engine::score_chart({})); }, "score_chart", "periods size", {},
                        0, "at least 1");
    AuditSample none = sample;
    none.count.setZero();
    expect_domain_error([&] { static_cast<void>(engine::score_chart({none})); }, "score_chart", "patients",
                        {}, 0, "finite and > 0");
    expect_domain_error(
        [&] {
            static_cast<void>(engine::score_chart({sample, made_sample(3, 3, 1.0, 2, 1)}));
        },
        "score_chart", "periods log_forecast columns size", {}, 3, "2");
}

}  // namespace
}  // namespace steelyard::test
