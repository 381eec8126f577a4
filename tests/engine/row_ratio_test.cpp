// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/row_ratio.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <boost/math/distributions/non_central_t.hpp>
#include <cmath>
#include <limits>
#include <optional>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/beta_ratio.hpp"
#include "steelyard/engine/distributions.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

CompiledRow ratio_against(const CompiledRow& reference, const std::vector<double>& ratio,
                          const std::vector<double>& log_sd) {
    return ratio_row(array(ratio), array(log_sd), reference.probability, 1.0).row;
}

TEST(RowRatio, OfTwoCountedRowsIsThatOfTheirBetas) {
    const std::vector<CompiledRow> rows = {
        counts_row(array({0, 0, 3})),           counts_row(array({3, 0, 40})),
        counts_row(array({40, 1, 2})),          counts_row(array({12, 8, 0})),
        counts_row(array({1, 30, 0})),          counts_row(array({200, 300, 500})),
        share_row(array({.9, .005, .095}), 20), share_row(array({.1, .8, .1}), 4)};
    for (const CompiledRow& a : rows) {
        for (const CompiledRow& b : rows) {
            const BetaShape top = band_margin(std::get<DirichletLaw>(a.law).alpha, 1);
            const BetaShape bottom = band_margin(std::get<DirichletLaw>(b.law).alpha, 1);
            const LogShareLaw law_a(a, 1);
            const LogShareLaw law_b(b, 1);
            const double low = std::log(beta_ratio_quantile(top, bottom, 0.025));
            const double high = std::log(beta_ratio_quantile(top, bottom, 0.975));
            const double bound = 0.01 * (high - low);  // the header's promise
            EXPECT_TRUE(near_abs(low, log_ratio_quantile(law_a, law_b, 0.025), bound))
                << top.a << " " << bottom.a;
            EXPECT_TRUE(near_abs(high, log_ratio_quantile(law_a, law_b, 0.975), bound))
                << top.a << " " << bottom.a;
        }
    }
}

TEST(RowRatio, OfASummaryRowFollowsTheToleranceFactors) {
    // One-sided tolerance factors k(content, confidence, n): mean + k sd covers `content` of a normal
    // quantity with `confidence`. Under the noninformative posterior that is the statement P(share below mean
    // + k sd >= content) = confidence. Factors as printed in Natrella, Experimental Statistics (NBS Handbook
    // 91, 1963), table A-7, from memory.
    struct Printed {
        double n, content, confidence, k;
    };
    for (const Printed& row : {Printed{10, 0.90, 0.95, 2.355}, Printed{10, 0.95, 0.95, 2.911},
                               Printed{5, 0.95, 0.95, 4.202}, Printed{20, 0.90, 0.95, 1.926}}) {
        const CompiledRow compiled = summary_row(0.0, 1.0, row.n, Scale::linear, array({row.k}));
        const LogShareLaw below(compiled, 0);
        // The share missed above the edge carries the digits.
        const LogShareLaw above(compiled, 1);
        EXPECT_TRUE(near_abs(1.0 - row.confidence, below.cdf(std::log(row.content)), 0.004)) << row.n;
        EXPECT_TRUE(near_abs(row.confidence, above.cdf(std::log(1.0 - row.content)), 0.004)) << row.n;
    }
}

/// The ln share below mean + k sd of a summary row that has posterior probability q below it, from the
/// noncentral t: P(share <= x) = 1 - F(k sqrt(n); n - 1, z_x sqrt(n)). By halving.
double exact_log_share(double n, double k, double q) {
    double low = -30.0;
    double high = 30.0;
    for (int i = 0; i < 80; ++i) {
        const double z = (low + high) / 2.0;
        const boost::math::non_central_t_distribution<double> t(n - 1.0, z * std::sqrt(n));
        (1.0 - boost::math::cdf(t, k * std::sqrt(n)) < q ? low : high) = z;
    }
    return std::log(normal_lower(low));
}

TEST(RowRatio, OfASummaryRowFollowsTheNoncentralT) {
    for (const double n : {3.0, 6.0, 25.0, 400.0}) {
        for (const double k : {-2.0, -0.5, 0.0, 1.0, 2.5}) {
            const LogShareLaw law(summary_row(5.0, 2.0, n, Scale::linear, array({5.0 + 2.0 * k, 100.0})), 0);
            const double width = exact_log_share(n, k, 0.975) - exact_log_share(n, k, 0.025);
            for (const double q : {0.025, 0.5, 0.975}) {
                EXPECT_TRUE(near_abs(exact_log_share(n, k, q), law.quantile(q), 0.01 * width))
                    << n << " " << k << " " << q;
            }
        }
    }
}

TEST(RowRatio, OfManyPatientsIsTheDeltaMethod) {
    // An inner band, many patients: ln share is nearly normal with the variance of the delta method,
    // (d ln p / d mean)^2 sd^2 / n + (d ln p / d sd)^2 sd^2 / (2 n).
    const double n = 4000.0;
    const double low = -0.4;
    const double high = 1.1;
    const auto density = [](double z) { return std::exp(-z * z / 2.0) / std::sqrt(2.0 * M_PI); };
    const double share = normal_lower(high) - normal_lower(low);
    const double by_mean = -(density(high) - density(low)) / share;
    const double by_sd = -(high * density(high) - low * density(low)) / share;
    const double sd = std::sqrt(by_mean * by_mean / n + by_sd * by_sd / (2.0 * n));
    const CompiledRow row = summary_row(0.0, 1.0, n, Scale::linear, array({low, high}));
    const LogShareLaw law(row, 1);
    EXPECT_TRUE(near_rel(sd, law.standard_deviation(), 0.02));
    const IntervalEstimate interval = row_ratio_interval(law, LogShareLaw::fixed(share));
    EXPECT_TRUE(near_rel(std::exp(1.96 * sd), interval.high, 2e-3));
    EXPECT_TRUE(near_rel(std::exp(-1.96 * sd), interval.low, 2e-3));
}

TEST(RowRatio, OfARaisedSummaryRowIsCutOffAtTheLeast) {
    // The same row with and without a least of 0.02. Above the cut the law is the unbounded one, divided by
    // the sum of the raised row; below it everything stands at the raised share.
    const CompiledRow plain = summary_row(0.0, 1.0, 12.0, Scale::linear, array({1.0, 2.5}));
    constexpr double least = 0.02;
    ASSERT_LT(plain.probability(2), least);
    CompiledRow raised = plain;
    raised.probability = keep_at_least(plain.probability, least).probability;
    std::get<SummaryLaw>(raised.law).least = least;
    const double log_sum = std::log(plain.probability.max(least).sum());
    for (const Eigen::Index band : {0, 1, 2}) {
        const LogShareLaw free(plain, band);
        const LogShareLaw bounded(raised, band);
        const double width = free.quantile(0.975) - free.quantile(0.025);
        for (const double q : {0.025, 0.3, 0.7, 0.975}) {
            const double wanted = std::max(free.quantile(q), std::log(least)) - log_sum;
            EXPECT_TRUE(near_abs(wanted, bounded.quantile(q), 0.01 * width)) << band << " " << q;
        }
    }
    const IntervalEstimate ratio = row_ratio_interval(raised, raised, 2);
    EXPECT_LT(ratio.low, 1.0);
    EXPECT_GT(ratio.high, 1.0);
    std::get<SummaryLaw>(raised.law).least = 0.3;
    expect_domain_error([&] { (void)LogShareLaw(raised, 2); }, "LogShareLaw", "row.law.least", {}, 0.3,
                        "between 0 and 0.2");
}

TEST(RowRatio, ReadsALogScaleAsTheLogarithm) {
    const CompiledRow linear = summary_row(1.0, 0.5, 12, Scale::linear, array({0.5, 1.5}));
    const CompiledRow log = summary_row(1.0, 0.5, 12, Scale::log, array({std::exp(0.5), std::exp(1.5)}));
    for (Eigen::Index band = 0; band < 3; ++band) {
        EXPECT_TRUE(
            near_abs(LogShareLaw(linear, band).quantile(0.1), LogShareLaw(log, band).quantile(0.1), 1e-9));
    }
}

TEST(RowRatio, AgainstItsOwnReferenceIsThePublishedInterval) {
    const CompiledRow reference = counts_row(array({30, 20, 10}));
    const CompiledRow row = ratio_against(reference, {0.5, 1.2, 2.1}, {0.3, 0.0, 0.4});
    const double ratio = row.probability(0) / reference.probability(0);
    const IntervalEstimate published =
        row_ratio_interval(LogShareLaw(row, 0), LogShareLaw::fixed(reference.probability(0)));
    const double z = two_sided_normal_quantile(0.95);
    EXPECT_TRUE(near_rel(ratio, published.value, 1e-14));
    EXPECT_TRUE(near_rel(ratio * std::exp(-0.3 * z), published.low, 1e-3));
    EXPECT_TRUE(near_rel(ratio * std::exp(0.3 * z), published.high, 1e-3));
    // No interval was published for the second band: none is shown.
    const IntervalEstimate bare =
        row_ratio_interval(LogShareLaw(row, 1), LogShareLaw::fixed(reference.probability(1)));
    EXPECT_TRUE(near_rel(bare.value, bare.low, 1e-14));
    EXPECT_TRUE(near_rel(bare.value, bare.high, 1e-14));
}

TEST(RowRatio, AgainstAThirdCauseCarriesTheReferencesUncertainty) {
    const CompiledRow reference = counts_row(array({30, 20, 10}));
    const CompiledRow row = ratio_against(reference, {0.5, 1.2, 2.1}, {0.3, 0.0, 0.4});
    const double own = LogShareLaw(row, 0).standard_deviation();
    const double base = LogShareLaw(reference, 0).standard_deviation();
    EXPECT_TRUE(near_rel(0.3, own, 0.01));
    EXPECT_TRUE(near_rel(std::hypot(own, base), LogShareLaw(row, 0, &reference).standard_deviation(), 0.01));
    // No interval was published for the second band: what is left is the reference's own.
    EXPECT_TRUE(near_rel(LogShareLaw(reference, 1).standard_deviation(),
                         LogShareLaw(row, 1, &reference).standard_deviation(), 1e-9));
}

TEST(RowRatio, HoldsItsEstimateAndTurnsOver) {
    EXPECT_TRUE(rc::check([] {
        const auto row = [] {
            if (*rc::gen::arbitrary<bool>()) {
                const double share = *rc::gen::inRange(1, 998) / 1000.0;
                return share_row(array({share, 0.999 - share, 0.001}), *rc::gen::inRange(1, 200));
            }
            return summary_row(*rc::gen::inRange(-30, 30) / 10.0, *rc::gen::inRange(1, 30) / 10.0,
                               *rc::gen::inRange(2, 60), Scale::linear, array({-0.5, 0.5}));
        };
        const CompiledRow a = row();
        const CompiledRow b = row();
        const Eigen::Index band = *rc::gen::inRange(0, 3);
        const IntervalEstimate there = row_ratio_interval(a, b, band);
        RC_ASSERT(there.low <= there.value && there.value <= there.high);
        const LogShareLaw law_a(a, band);
        const LogShareLaw law_b(b, band);
        const double forth = log_ratio_quantile(law_a, law_b, 0.025);
        RC_ASSERT(near_abs(forth, -log_ratio_quantile(law_b, law_a, 0.975), 1e-9 * (1.0 + std::abs(forth))));
        const IntervalEstimate wide = row_ratio_interval(a, b, band, 0.99);
        RC_ASSERT(wide.low <= there.low && there.high <= wide.high);
    }));
}

TEST(RowRatio, SurvivesExtremeLaws) {
    for (const double worth : {1e-6, 1e-3, 1.0, 1e6, 1e12}) {
        const CompiledRow row = share_row(array({1e-6, 0.5, 0.5 - 1e-6}), worth);
        const CompiledRow even = share_row(array({0.25, 0.25, 0.5}), worth);
        for (Eigen::Index band = 0; band < 3; ++band) {
            const IntervalEstimate interval = row_ratio_interval(row, even, band);
            EXPECT_LE(interval.low, interval.value) << worth << " " << band;
            EXPECT_LE(interval.value, interval.high) << worth << " " << band;
        }
    }
    // A band ten standard deviations away.
    const CompiledRow far = summary_row(0.0, 1.0, 1000, Scale::linear, array({10.0}));
    const IntervalEstimate interval = row_ratio_interval(far, far, 1);
    EXPECT_LT(interval.low, 1.0);
    EXPECT_GT(interval.high, 1.0);
    EXPECT_GT(interval.low, 0.0);
}

TEST(RowRatio, RefusesRowsThatDoNotBelongTogether) {
    const CompiledRow two = counts_row(array({3, 4}));
    const CompiledRow three = counts_row(array({3, 4, 5}));
    expect_domain_error([&] { (void)row_ratio_interval(two, three, 0); }, "row_ratio_interval", "b size", {},
                        3, "2");
    expect_domain_error([&] { (void)LogShareLaw(two, 2); }, "LogShareLaw", "band", {}, 2, "between 0 and 1");
    expect_domain_error([] { (void)LogShareLaw::fixed(0.0); }, "LogShareLaw::fixed", "share", {}, 0,
                        "above 0 and at most 1");
    expect_domain_error([&] { (void)row_ratio_interval(two, two, 0, 1.5); }, "row_ratio_interval", "level",
                        {}, 1.5, "above 0 and below 1");
    const CompiledRow ratio = ratio_against(two, {1.0, 1.0}, {0.1, 0.1});
    expect_domain_error([&] { (void)LogShareLaw(ratio, 0, &ratio); }, "LogShareLaw", "reference", {}, 2,
                        "a row with a law of its own");
}

}  // namespace
