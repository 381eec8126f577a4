// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/likelihood_ratio.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <optional>
#include <sstream>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/beta_ratio.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::ReferenceTable;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

/// The counts of tests/reference/two_by_two_inputs.csv, by name.
std::map<std::string, TwoByTwo> two_by_two_cases() {
    std::ifstream in = steelyard::test::open_reference("two_by_two_inputs.csv");
    std::map<std::string, TwoByTwo> cases;
    std::string line;
    std::getline(in, line);
    EXPECT_EQ(line, "id,a,b,c,d");
    while (std::getline(in, line)) {
        std::stringstream cells(line);
        std::vector<std::string> cell(5);
        for (std::string& text : cell) {
            std::getline(cells, text, ',');
        }
        cases[cell[0]] = {std::stod(cell[1]), std::stod(cell[2]), std::stod(cell[3]), std::stod(cell[4])};
    }
    return cases;
}

void expect_limits(const ReferenceTable& table, const std::string& name, const std::string& quantity,
                   const IntervalEstimate& got) {
    EXPECT_TRUE(table.matches(name, quantity + "_lower", got.low));
    EXPECT_TRUE(table.matches(name, quantity + "_upper", got.high));
}

TEST(TestAccuracy, AndRatiosAgreeWithEpiR) {
    const ReferenceTable table("two_by_two.csv");
    for (const auto& [name, counts] : two_by_two_cases()) {
        const TestAccuracy wilson = test_accuracy(counts, ProportionMethod::wilson);
        const TestAccuracy exact = test_accuracy(counts, ProportionMethod::exact);
        const std::map<std::string, IntervalEstimate TestAccuracy::*> members = {
            {"se", &TestAccuracy::sensitivity},
            {"sp", &TestAccuracy::specificity},
            {"pv.pos", &TestAccuracy::positive_predictive_value},
            {"pv.neg", &TestAccuracy::negative_predictive_value}};
        for (const auto& [quantity, member] : members) {
            EXPECT_TRUE(table.matches(name, quantity + "_est", (wilson.*member).value));
            expect_limits(table, name, quantity + "_wilson", wilson.*member);
            expect_limits(table, name, quantity + "_exact", exact.*member);
        }
        if (table.has(name, "lr.pos_est")) {
            const IntervalEstimate positive = ratio_log_interval(positive_counts(counts));
            const IntervalEstimate negative = ratio_log_interval(negative_counts(counts));
            const IntervalEstimate odds = diagnostic_odds_ratio(counts);
            EXPECT_TRUE(table.matches(name, "lr.pos_est", positive.value));
            EXPECT_TRUE(table.matches(name, "lr.neg_est", negative.value));
            EXPECT_TRUE(table.matches(name, "diag.or_est", odds.value));
            expect_limits(table, name, "lr.pos_log", positive);
            expect_limits(table, name, "lr.neg_log", negative);
            expect_limits(table, name, "diag.or_log", odds);
        }
        expect_limits(table, name, "lr.pos_koopman", ratio_score_interval(positive_counts(counts)));
    }
    EXPECT_EQ(table.unused(), std::vector<std::string>{});
}

TEST(LikelihoodRatio, AgreesWithTheReferenceTable) {
    const ReferenceTable table("likelihood_ratio.csv");
    const auto inputs = steelyard::test::reference_json("likelihood_ratio_inputs.json");
    for (const auto& [name, counts] : two_by_two_cases()) {
        const std::map<std::string, RatioCounts> ratios = {{"lr.pos", positive_counts(counts)},
                                                           {"lr.neg", negative_counts(counts)}};
        for (const auto& [which, ratio] : ratios) {
            expect_limits(table, name, which + "_koopman",
                          ratio_score_interval(ratio, ScoreVariance::koopman));
            expect_limits(table, name, which + "_miettinen_nurminen",
                          ratio_score_interval(ratio, ScoreVariance::miettinen_nurminen));
            const IntervalEstimate half = ratio_log_interval(with_half_counts(ratio));
            EXPECT_TRUE(table.matches(name, which + "_half_est", half.value));
            expect_limits(table, name, which + "_half_log", half);
        }
    }
    for (const auto& one : inputs.at("wilson")) {
        const std::string name = one.at("id");
        expect_limits(table, name, "wilson", wilson_interval(one.at("x"), one.at("n")));
        expect_limits(table, name, "clopper_pearson", exact_interval(one.at("x"), one.at("n")));
    }
    for (const auto& one : inputs.at("interval_lr")) {
        const std::string name = one.at("id");
        const Eigen::ArrayXd with = steelyard::test::numbers(one.at("counts_with"));
        const Eigen::ArrayXd without = steelyard::test::numbers(one.at("counts_without"));
        const std::vector<IntervalEstimate> scores = band_ratios(with, without);
        for (Eigen::Index band = 0; band < with.size(); ++band) {
            const std::string tag =
                "[" + one.at("categories").at(static_cast<std::size_t>(band)).get<std::string>() + "]";
            const IntervalEstimate& score = scores.at(static_cast<std::size_t>(band));
            EXPECT_TRUE(table.matches(name, "LR_koopman_lower" + tag, score.low));
            EXPECT_TRUE(table.matches(name, "LR_koopman_upper" + tag, score.high));
            if (with(band) > 0 && without(band) > 0) {
                const RatioCounts counts{with(band), with.sum(), without(band), without.sum()};
                const IntervalEstimate log = ratio_log_interval(counts);
                EXPECT_TRUE(table.matches(name, "LR" + tag, log.value));
                EXPECT_TRUE(table.matches(name, "LR_log_lower" + tag, log.low));
                EXPECT_TRUE(table.matches(name, "LR_log_upper" + tag, log.high));
                EXPECT_TRUE(table.matches(name, "se_lnLR" + tag, log_ratio_standard_error(counts)));
            }
        }
    }
    for (const auto& one : inputs.at("dirichlet")) {
        const std::string name = one.at("id");
        const Eigen::ArrayXd with = steelyard::test::numbers(one.at("counts_with"));
        const Eigen::ArrayXd without = steelyard::test::numbers(one.at("counts_without"));
        for (const auto& [prior, start] : one.at("priors").items()) {
            for (Eigen::Index band = 0; band < with.size(); ++band) {
                const std::string tag =
                    "[" + one.at("categories").at(static_cast<std::size_t>(band)).get<std::string>() +
                    ";prior=" + prior + "]";
                const BetaShape top = band_margin(with + steelyard::test::number(start), band);
                const BetaShape bottom = band_margin(without + steelyard::test::number(start), band);
                const double mean_top = top.a / (top.a + top.b);
                const double mean_bottom = bottom.a / (bottom.a + bottom.b);
                EXPECT_TRUE(table.matches(name, "post_mean_with" + tag, mean_top));
                EXPECT_TRUE(table.matches(name, "post_mean_without" + tag, mean_bottom));
                EXPECT_TRUE(table.matches(name, "LR_of_means" + tag, mean_top / mean_bottom));
                const LogRatioMoments moments = log_ratio_moments(top, bottom);
                EXPECT_TRUE(table.matches(name, "E_lnLR" + tag, moments.mean));
                EXPECT_TRUE(table.matches(name, "SD_lnLR" + tag, std::sqrt(moments.variance)));
                const std::map<std::string, double> quantiles = {
                    {"0.025", 0.025}, {"0.5", 0.5}, {"0.975", 0.975}};
                for (const auto& [text, q] : quantiles) {
                    EXPECT_TRUE(table.matches(name, "beta_q" + text + "_with" + tag, beta_quantile(top, q)));
                    EXPECT_TRUE(
                        table.matches(name, "LR_q" + text + tag, beta_ratio_quantile(top, bottom, q)));
                }
            }
        }
    }
    EXPECT_EQ(table.unused(), std::vector<std::string>{});
}

TEST(WilsonInterval, GivesThePrintedLimitsOfNewcombe) {
    // Newcombe, Stat Med 1998;17:857, table I, method 3, to the four digits printed there.
    const std::vector<std::pair<std::pair<double, double>, std::pair<double, double>>> printed = {
        {{81, 263}, {0.2553, 0.3662}},
        {{15, 148}, {0.0624, 0.1605}},
        {{0, 20}, {0.0, 0.1611}},
        {{1, 29}, {0.0061, 0.1718}}};
    for (const auto& [counts, limits] : printed) {
        const IntervalEstimate got = wilson_interval(counts.first, counts.second);
        EXPECT_TRUE(near_abs(limits.first, got.low, 0.5e-4));
        EXPECT_TRUE(near_abs(limits.second, got.high, 0.5e-4));
    }
}

TEST(LikelihoodRatio, GivesPrintedIntervals) {
    // epiR manual, epi.tests, data of Scott et al. 2008: positive ratio 3.75 (3.32 to 4.24).
    const IntervalEstimate scott = ratio_log_interval(positive_counts({670, 202, 74, 640}));
    EXPECT_TRUE(near_abs(3.75, scott.value, 0.005));
    EXPECT_TRUE(near_abs(3.32, scott.low, 0.005));
    EXPECT_TRUE(near_abs(4.24, scott.high, 0.005));
    // scipy manual, stats.contingency.relative_risk, 10 of 75 against 12 of 225: 1.1261564003469628 to
    // 5.549850800541033.
    const IntervalEstimate scipy = ratio_log_interval({10, 75, 12, 225});
    EXPECT_TRUE(near_rel(1.1261564003469628, scipy.low, 1e-14));
    EXPECT_TRUE(near_rel(5.549850800541033, scipy.high, 1e-14));
    // Koopman, Biometrics 1984;40:513, example: 36 of 40 against 16 of 80, 2.94 to 7.15 (from memory; the
    // limits of the reference table are recomputed and agree).
    const IntervalEstimate koopman = ratio_score_interval({36, 40, 16, 80});
    EXPECT_TRUE(near_abs(2.94, koopman.low, 0.005));
    EXPECT_TRUE(near_abs(7.15, koopman.high, 0.005));
    // A textbook exercise on faecal occult blood in 203 people: LR+ 7.41, LR- 0.37.
    const TwoByTwo blood{2, 18, 1, 182};
    EXPECT_TRUE(near_abs(7.41, ratio_log_interval(positive_counts(blood)).value, 0.005));
    EXPECT_TRUE(near_abs(0.37, ratio_log_interval(negative_counts(blood)).value, 0.005));
}

TEST(WilsonInterval, EndsExactlyAtZeroAndOne) {
    EXPECT_TRUE(rc::check([] {
        const double n = *rc::gen::inRange(1, 100000);
        const IntervalEstimate none = wilson_interval(0, n);
        const IntervalEstimate all = wilson_interval(n, n);
        RC_ASSERT(none.low == 0.0 && none.value == 0.0 && none.high > 0.0);
        RC_ASSERT(all.high == 1.0 && all.value == 1.0 && all.low < 1.0);
        // The two ends mirror each other.
        RC_ASSERT(near_abs(1.0 - none.high, all.low, 1e-15));
        RC_ASSERT(exact_interval(0, n).low == 0.0);
        RC_ASSERT(exact_interval(n, n).high == 1.0);
    }));
}

TEST(LikelihoodRatio, IntervalsHoldTheEstimateAndGrowWithTheLevel) {
    EXPECT_TRUE(rc::check([] {
        const double n1 = *rc::gen::inRange(1, 400);
        const double n0 = *rc::gen::inRange(1, 400);
        const double x1 = *rc::gen::inRange(0, static_cast<int>(n1) + 1);
        const double x0 = *rc::gen::inRange(0, static_cast<int>(n0) + 1);
        RC_PRE(x1 + x0 > 0);
        for (const ScoreVariance variance : {ScoreVariance::koopman, ScoreVariance::miettinen_nurminen}) {
            const IntervalEstimate narrow = ratio_score_interval({x1, n1, x0, n0}, variance, 0.8);
            const IntervalEstimate wide = ratio_score_interval({x1, n1, x0, n0}, variance, 0.95);
            RC_ASSERT(narrow.low <= narrow.value && narrow.value <= narrow.high);
            RC_ASSERT(wide.low <= narrow.low && narrow.high <= wide.high);
            RC_ASSERT((wide.low == 0.0) == (x1 == 0.0));
            RC_ASSERT(std::isinf(wide.high) == (x0 == 0.0));
        }
        if (x1 > 0 && x0 > 0) {
            const IntervalEstimate log = ratio_log_interval({x1, n1, x0, n0});
            RC_ASSERT(log.low <= log.value && log.value <= log.high);
        }
    }));
}

TEST(LikelihoodRatio, TurnsOverWithItsGroups) {
    EXPECT_TRUE(rc::check([] {
        const double n1 = *rc::gen::inRange(2, 400);
        const double n0 = *rc::gen::inRange(2, 400);
        const double x1 = *rc::gen::inRange(1, static_cast<int>(n1) + 1);
        const double x0 = *rc::gen::inRange(1, static_cast<int>(n0) + 1);
        const IntervalEstimate there = ratio_score_interval({x1, n1, x0, n0});
        const IntervalEstimate back = ratio_score_interval({x0, n0, x1, n1});
        RC_ASSERT(near_rel(1.0 / there.high, back.low, 1e-10));
        RC_ASSERT(near_rel(1.0 / there.low, back.high, 1e-10));
    }));
}

TEST(LikelihoodRatio, OfANegativeResultRestsOnTheNegativeCells) {
    const TwoByTwo table{18, 5, 7, 40};
    const RatioCounts negative = negative_counts(table);
    EXPECT_EQ(negative.x1, 7);
    EXPECT_EQ(negative.x0, 40);
    // Turning LR+ over would give 0.174 to 0.0651: another number altogether.
    const IntervalEstimate interval = ratio_log_interval(negative);
    EXPECT_TRUE(near_rel((7.0 / 25.0) / (40.0 / 45.0), interval.value, 1e-15));
    EXPECT_GT(interval.low, 1.0 / ratio_log_interval(positive_counts(table)).low / 3.0);
}

TEST(LikelihoodRatio, WithHalfCountsIsTheRatioOfJeffreysMeans) {
    const Eigen::ArrayXd with = (Eigen::ArrayXd(3) << 12, 8, 0).finished();
    const Eigen::ArrayXd without = (Eigen::ArrayXd(3) << 0, 9, 31).finished();
    for (Eigen::Index band = 0; band < 3; ++band) {
        const RatioCounts half = with_half_counts({with(band), 20, without(band), 40}, 3);
        EXPECT_TRUE(near_rel(((with(band) + 0.5) / 21.5) / ((without(band) + 0.5) / 41.5),
                             (half.x1 / half.n1) / (half.x0 / half.n0), 1e-15));
    }
}

TEST(LikelihoodRatio, OfTwoProportionsOfOneIsOne) {
    const IntervalEstimate both = ratio_score_interval({10, 10, 30, 30});
    EXPECT_EQ(both.value, 1.0);
    // By hand: at r < 1 the likelihood is highest at p0 = 1, so n1 (1 - r) / r = z^2, r = n1 / (n1 + z^2).
    const double square = std::pow(two_sided_normal_quantile(0.95), 2);
    EXPECT_TRUE(near_rel(10.0 / (10.0 + square), both.low, 1e-13));
    EXPECT_TRUE(near_rel((30.0 + square) / 30.0, both.high, 1e-13));
}

TEST(BandRatios, KnowNothingOfABandThatIsEmptyInBothGroups) {
    const Eigen::ArrayXd with = (Eigen::ArrayXd(3) << 12, 0, 8).finished();
    const Eigen::ArrayXd without = (Eigen::ArrayXd(3) << 3, 0, 30).finished();
    const IntervalEstimate empty = band_ratios(with, without).at(1);
    EXPECT_TRUE(std::isnan(empty.value));
    EXPECT_EQ(empty.low, 0.0);
    EXPECT_EQ(empty.high, infinity);
}

TEST(BandRatios, WeighedByTheOtherRowAddToOne) {
    // sum over bands of P(band | without) LR(band) = 1: a check on any complete table.
    EXPECT_TRUE(rc::check([] {
        const auto counts = *rc::gen::container<std::vector<int>>(8, rc::gen::inRange(1, 500));
        const Eigen::ArrayXd both = Eigen::Map<const Eigen::ArrayXi>(counts.data(), 8).cast<double>();
        const Eigen::ArrayXd with = both.head(4);
        const Eigen::ArrayXd without = both.tail(4);
        const std::vector<IntervalEstimate> ratios = band_ratios(with, without);
        double sum = 0.0;
        for (Eigen::Index band = 0; band < 4; ++band) {
            sum += without(band) / without.sum() * ratios.at(static_cast<std::size_t>(band)).value;
        }
        RC_ASSERT(near_rel(1.0, sum, 1e-14));
    }));
}

TEST(BetaRatio, HasTheClosedFormOfUniformShares) {
    // Two uniform shares: P(p1 / p0 <= r) = r / 2 for r <= 1 and 1 - 1 / (2 r) above.
    for (const double r : {0.01, 0.3, 1.0, 1.0000001, 2.0, 50.0}) {
        EXPECT_TRUE(
            near_abs(r <= 1.0 ? r / 2.0 : 1.0 - 1.0 / (2.0 * r), beta_ratio_cdf({1, 1}, {1, 1}, r), 1e-13));
    }
    EXPECT_TRUE(near_rel(0.05, beta_ratio_quantile({1, 1}, {1, 1}, 0.025), 1e-11));
    EXPECT_TRUE(near_rel(20.0, beta_ratio_quantile({1, 1}, {1, 1}, 0.975), 1e-11));
    // Powers: p1 = u^(1/a), p0 = v^(1/a) for Beta(a, 1), so P = r^a / 2 below 1.
    for (const double a : {0.05, 0.5, 3.0, 200.0, 1e4}) {
        EXPECT_TRUE(near_rel(0.5 * std::pow(0.99, a), beta_ratio_cdf({a, 1}, {a, 1}, 0.99), 1e-10)) << a;
    }
}

TEST(BetaRatio, TurnsOverWithItsShapes) {
    EXPECT_TRUE(rc::check([] {
        const auto shape = [] {
            return BetaShape{std::exp(*rc::gen::inRange(-150, 600) / 100.0),
                             std::exp(*rc::gen::inRange(-150, 600) / 100.0)};
        };
        const BetaShape one = shape();
        const BetaShape other = shape();
        const double r = std::exp(*rc::gen::inRange(-200, 200) / 100.0);
        RC_ASSERT(near_abs(1.0 - beta_ratio_cdf(one, other, r), beta_ratio_cdf(other, one, 1.0 / r), 1e-10));
    }));
}

TEST(BandMargin, KeepsTheDigitsOfWhatIsLeft) {
    const Eigen::ArrayXd alpha = (Eigen::ArrayXd(3) << 1e12, 1e-3, 2e-3).finished();
    EXPECT_TRUE(near_rel(3e-3, band_margin(alpha, 0).b, 1e-15));
}

TEST(LikelihoodRatio, RefusesWhatIsNotACount) {
    const std::optional<Eigen::Index> none;
    expect_domain_error([] { (void)wilson_interval(3, 0); }, "wilson_interval", "n", {}, 0, "finite and > 0");
    expect_domain_error([] { (void)wilson_interval(nan, 4); }, "wilson_interval", "x", {}, nan,
                        "between 0 and 4");
    expect_domain_error([] { (void)wilson_interval(1, 4, 1.0); }, "wilson_interval", "level", {}, 1,
                        "above 0 and below 1");
    expect_domain_error([] { (void)exact_interval(5, 4); }, "exact_interval", "x", {}, 5, "between 0 and 4");
    expect_domain_error(
        [] {
            (void)ratio_log_interval({0, 4, 1, 4});
        },
        "log_ratio_standard_error", "x1", {}, 0, "finite and > 0");
    expect_domain_error(
        [] {
            (void)ratio_score_interval({0, 4, 0, 4});
        },
        "ratio_score_interval", "x1 + x0", {}, 0, "above 0");
    expect_domain_error(
        [] {
            (void)ratio_score_interval({1, 4, 9, 4});
        },
        "ratio_score_interval", "x0", {}, 9, "between 0 and 4");
    expect_domain_error(
        [] {
            (void)with_half_counts({1, 4, 1, 4}, 1);
        },
        "with_half_counts", "bands", {}, 1, ">= 2");
    expect_domain_error(
        [] {
            (void)test_accuracy({0, 3, 0, 5});
        },
        "test_accuracy", "true_positive + false_negative", {}, 0, "finite and > 0");
    expect_domain_error(
        [] {
            (void)diagnostic_odds_ratio({1, 3, 0, 5});
        },
        "diagnostic_odds_ratio", "false_negative", {}, 0, "finite and > 0");
    const Eigen::ArrayXd row = (Eigen::ArrayXd(2) << 1, -1).finished();
    expect_domain_error([&] { (void)band_ratios(row.abs(), row); }, "band_ratios", "without", {1, none}, -1,
                        "finite and >= 0");
    expect_domain_error([&] { (void)band_margin(row, 0); }, "band_margin", "alpha", {1, none}, -1,
                        "finite and > 0");
    expect_domain_error([&] { (void)band_margin(row.abs(), 2); }, "band_margin", "band", {}, 2,
                        "between 0 and 1");
    expect_domain_error(
        [] {
            (void)beta_ratio_cdf({1, 1}, {1, 0}, 1);
        },
        "beta_ratio_cdf", "denominator", {}, 0, "finite and > 0");
    expect_domain_error(
        [] {
            (void)beta_ratio_quantile({1, 1}, {1, 1}, 0);
        },
        "beta_ratio_quantile", "q", {}, 0, "between 1e-06 and 0.999999");
}

}  // namespace
