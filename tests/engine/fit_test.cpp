// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/fit.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <limits>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "random_tables.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::array;
using steelyard::test::expect_domain_error;
using steelyard::test::near_rel;
using steelyard::test::random_share;
using steelyard::test::random_table;

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// A counter-based generator small enough to read: SplitMix64's finaliser over the two counters (Steele, Lea
/// and Flood 2014, constants from memory; any good mixer would do).
double uniform(std::uint64_t draw, std::uint32_t finding) {
    std::uint64_t x = draw * 1024U + finding + 1U;
    x *= 0x9e3779b97f4a7c15U;
    x = (x ^ (x >> 30U)) * 0xbf58476d1ce4e5b9U;
    x = (x ^ (x >> 27U)) * 0x94d049bb133111ebU;
    x ^= x >> 31U;
    return (static_cast<double>(x >> 12U) + 0.5) * 0x1p-52;
}

/// A random pattern of 1 to `most` findings of 2 to 5 bands under three causes; shares from `least`
/// thousandths.
struct Pattern {
    explicit Pattern(int least = 1, int most = 5) {
        const int findings = *rc::gen::inRange(1, most + 1);
        for (int f = 0; f < findings; ++f) {
            const auto count = *rc::gen::inRange<Eigen::Index>(2, 6);
            bands.push_back(random_table(count, 3, least));
            seen.push_back(BandIndex{*rc::gen::inRange<Eigen::Index>(0, count)});
        }
    }
    std::vector<Eigen::ArrayXXd> bands;
    std::vector<BandIndex> seen;
};

/// Every outcome's probability given each cause, in long double: a list over outcomes of lists over causes.
std::vector<std::vector<long double>> all_outcomes(const std::vector<Eigen::ArrayXXd>& bands) {
    std::vector<std::vector<long double>> outcomes(
        1, std::vector<long double>(static_cast<std::size_t>(bands.front().cols()), 1.0L));
    for (const Eigen::ArrayXXd& table : bands) {
        std::vector<std::vector<long double>> longer;
        for (const auto& outcome : outcomes) {
            for (Eigen::Index b = 0; b < table.rows(); ++b) {
                longer.push_back(outcome);
                for (std::size_t k = 0; k < outcome.size(); ++k) {
                    longer.back()[k] *= table(b, static_cast<Eigen::Index>(k));
                }
            }
        }
        outcomes = longer;
    }
    return outcomes;
}

long double probability_given(const Pattern& p, Eigen::Index cause) {
    long double product = 1.0L;
    for (std::size_t f = 0; f < p.bands.size(); ++f) {
        product *= p.bands[f](p.seen[f].value, cause);
    }
    return product;
}

/// The log-likelihoods of a pattern; shape (F, K).
Eigen::ArrayXXd loglik_of(const Pattern& p) {
    Eigen::ArrayXXd loglik(static_cast<Eigen::Index>(p.seen.size()), p.bands.front().cols());
    for (std::size_t f = 0; f < p.seen.size(); ++f) {
        loglik.row(static_cast<Eigen::Index>(f)) = p.bands[f].row(p.seen[f].value).log();
    }
    return loglik;
}

// ---- conflict ----

TEST(Conflict, IsTheRatioOfTheProductOfMarginalsToTheJoint) {
    EXPECT_TRUE(rc::check([] {
        const Pattern p;
        const Eigen::ArrayXd prior = random_share(3);
        double apart = 1.0;
        for (std::size_t f = 0; f < p.bands.size(); ++f) {
            apart *= (prior * p.bands[f].row(p.seen[f].value).transpose()).sum();
        }
        double together = 0.0;
        for (Eigen::Index k = 0; k < 3; ++k) {
            together += prior(k) * static_cast<double>(probability_given(p, k));
        }
        const Conflict got = conflict(prior, loglik_of(p));
        RC_ASSERT(std::abs(got.bits - std::log2(apart / together)) < 1e-12);
        for (Eigen::Index k = 0; k < 3; ++k) {
            const double gain = std::log2(static_cast<double>(probability_given(p, k)) / together);
            RC_ASSERT(std::abs(got.gain_bits(k) - gain) < 1e-12);
        }
    }));
}

TEST(Conflict, OfFindingsThatContradictEachOtherIsExplainedByNeitherCause) {
    // Two 95 % findings for different causes: log2(0.25 / 0.0475); no posterior differs from its prior.
    const Eigen::ArrayXXd rows = (Eigen::ArrayXXd(2, 2) << 0.95, 0.05, 0.05, 0.95).finished();
    const Conflict got = conflict(array({0.5, 0.5}), rows.log());
    EXPECT_TRUE(near_rel(2.39592867633114, got.bits, 1e-14));
    EXPECT_EQ(got.explained_by, (std::vector<bool>{false, false}));
    const PredictiveCheck check =
        predictive_check(array({0.5, 0.5}), {rows, rows}, {BandIndex{0}, BandIndex{1}});
    EXPECT_TRUE(near_rel(0.095, check.p_value.value(), 1e-14));
}

TEST(Conflict, IsExplainedByARareCauseThatPredictsBothFindings) {
    // A third cause of prior 1 % under which both are near certain. By hand: each P(x) = 0.495 + 0.0099 =
    // 0.5049, together 0.99 * 0.0475 + 0.01 * 0.9801 = 0.056826.
    const Eigen::ArrayXXd seen = (Eigen::ArrayXXd(2, 3) << 0.95, 0.05, 0.99, 0.05, 0.95, 0.99).finished();
    const Conflict got = conflict(array({0.495, 0.495, 0.01}), seen.log());
    EXPECT_TRUE(near_rel(std::log2(0.5049 * 0.5049 / 0.056826), got.bits, 1e-13));
    EXPECT_TRUE(near_rel(std::log2(0.9801 / 0.056826), got.gain_bits(2), 1e-13));
    EXPECT_EQ(got.explained_by, (std::vector<bool>{false, false, true}));
}

TEST(Conflict, IsExactlyZeroWithFewerThanTwoFindings) {
    const Conflict none = conflict(array({0.2, 0.8}), Eigen::ArrayXXd(0, 2));
    EXPECT_EQ(none.bits, 0.0);
    EXPECT_LT(none.gain_bits.abs().maxCoeff(), 1e-15);
    EXPECT_EQ(none.explained_by, (std::vector<bool>{true, true}));
    const Conflict one = conflict(array({0.2, 0.8}), array({0.5, 0.125}).log().transpose());
    EXPECT_EQ(one.bits, 0.0);  // by hand P = 0.1 + 0.1
    EXPECT_TRUE(near_rel(std::log2(0.5 / 0.2), one.gain_bits(0), 1e-14));
    EXPECT_EQ(one.explained_by, (std::vector<bool>{true, false}));
}

TEST(Conflict, OfFlatFindingsIsNoneAndEveryCauseExplainsIt) {
    EXPECT_TRUE(rc::check([] {
        const Eigen::ArrayXd loglik = random_share(6).log();
        const Conflict got = conflict(random_share(4), loglik.replicate(1, 4));
        RC_ASSERT(std::abs(got.bits) < 1e-13);
        RC_ASSERT(got.explained_by == std::vector<bool>(4, true));
    }));
}

TEST(Conflict, SurvivesProbabilitiesThatUnderflow) {
    // 40 findings: 20 all but rule out the one cause, 20 the other. By hand: each P = 1/2 (to 1e-304),
    // together e^(-14000).
    Eigen::ArrayXXd loglik = Eigen::ArrayXXd::Zero(40, 2);
    loglik.col(0).head(20) = -700.0;
    loglik.col(1).tail(20) = -700.0;
    EXPECT_TRUE(near_rel(14000.0 / std::log(2.0) - 40.0, conflict(array({0.5, 0.5}), loglik).bits, 1e-14));
}

TEST(Conflict, KnowsACauseThatIsRuledOut) {
    const Eigen::ArrayXXd loglik = (Eigen::ArrayXXd(2, 2) << -infinity, -1.0, -1.0, -2.0).finished();
    const Conflict got = conflict(array({0.5, 0.5}), loglik);
    EXPECT_EQ(got.gain_bits(0), -infinity);
    EXPECT_TRUE(near_rel(1.0, got.gain_bits(1), 1e-14));
    EXPECT_FALSE(got.explained_by.at(0));
}

TEST(Conflict, DoesNotKnowTheOrderOfCausesOrFindings) {
    EXPECT_TRUE(rc::check([] {
        const Pattern p;
        const Eigen::ArrayXd prior = random_share(3);
        const Conflict there = conflict(prior, loglik_of(p));
        const Conflict back = conflict(prior.reverse(), loglik_of(p).reverse());
        RC_ASSERT(std::abs(there.bits - back.bits) < 1e-13);
        RC_ASSERT((there.gain_bits - back.gain_bits.reverse()).abs().maxCoeff() < 1e-13);
    }));
}

// ---- surprise ----

TEST(Surprise, ByMeetingInTheMiddleIsThatOfFullEnumeration) {
    EXPECT_TRUE(rc::check([] {
        const Pattern p(0);
        const auto outcomes = all_outcomes(p.bands);
        const Surprise got = surprise(p.bands, p.seen);
        RC_ASSERT(got.exact);
        RC_ASSERT((got.error == 0.0).all());
        for (Eigen::Index k = 0; k < 3; ++k) {
            const long double observed = probability_given(p, k);
            long double sum = 0.0L;
            for (const auto& outcome : outcomes) {
                const long double probability = outcome[static_cast<std::size_t>(k)];
                sum += probability <= observed * (1.0L + 1e-9L) ? probability : 0.0L;
            }
            const double want = static_cast<double>(sum);
            RC_ASSERT(std::abs(got.probability(k) - want) <= 1e-12 * want);
            RC_ASSERT(got.probability(k) <= 1.0);
            RC_ASSERT((got.probability(k) > 0.0) == (observed > 0.0L));
        }
    }));
}

TEST(Surprise, CountsOutcomesThatTie) {
    // Four findings alike, one of them positive: the four patterns with one positive tie, whichever way their
    // logarithms round. By hand P = 4 * 0.3 * 0.7^3 + those less probable: all but the all-negative pattern.
    const Eigen::ArrayXXd table = (Eigen::ArrayXXd(2, 1) << 0.7, 0.3).finished();
    for (std::size_t positive = 0; positive < 4; ++positive) {
        std::vector<BandIndex> seen(4);
        seen[positive].value = 1;
        const Surprise got = surprise(std::vector<Eigen::ArrayXXd>(4, table), seen);
        EXPECT_TRUE(near_rel(1.0 - std::pow(0.7, 4), got.probability(0), 1e-14));
    }
}

TEST(Surprise, IsOneForTheLikeliestPatternAndForFlatTables) {
    EXPECT_TRUE(rc::check([] {
        Pattern p;
        for (std::size_t f = 0; f < p.bands.size(); ++f) {
            p.bands[f].col(2) = 1.0 / static_cast<double>(p.bands[f].rows());
            p.bands[f].col(0).maxCoeff(&p.seen[f].value);
        }
        const Surprise got = surprise(p.bands, p.seen);
        RC_ASSERT(std::abs(got.probability(0) - 1.0) < 1e-14);
        RC_ASSERT(std::abs(got.probability(2) - 1.0) < 1e-14);
    }));
}

TEST(Surprise, IsAtMostAnyValueWithAtMostThatChance) {
    // What makes it a p value: over all patterns a cause can show, P(surprise <= u) <= u.
    EXPECT_TRUE(rc::check([] {
        Pattern p(0, 3);
        const double u = *rc::gen::inRange(1, 1000) * 0.001;
        const auto outcomes = all_outcomes(p.bands);
        double chance = 0.0;
        for (std::size_t i = 0; i < outcomes.size(); ++i) {
            std::size_t rest = i;  // the last finding's band changes fastest
            for (std::size_t f = p.bands.size(); f-- > 0;) {
                const auto count = static_cast<std::size_t>(p.bands[f].rows());
                p.seen[f].value = static_cast<Eigen::Index>(rest % count);
                rest /= count;
            }
            if (surprise(p.bands, p.seen).probability(0) <= u) {
                chance += static_cast<double>(outcomes[i][0]);
            }
        }
        RC_ASSERT(chance <= u + 1e-12);
    }));
}

TEST(Surprise, DoesNotKnowTheOrderOfCausesOrFindings) {
    EXPECT_TRUE(rc::check([] {
        const Pattern p;
        Pattern turned = p;
        std::reverse(turned.bands.begin(), turned.bands.end());
        std::reverse(turned.seen.begin(), turned.seen.end());
        for (Eigen::ArrayXXd& table : turned.bands) {
            table = table.rowwise().reverse().eval();
        }
        const Eigen::ArrayXd there = surprise(p.bands, p.seen).probability;
        const Eigen::ArrayXd back = surprise(turned.bands, turned.seen).probability.reverse();
        RC_ASSERT((there - back).abs().maxCoeff() < 1e-13);
    }));
}

TEST(Surprise, DrawnAgreesWithExactWithinItsError) {
    int far = 0;
    EXPECT_TRUE(rc::check([&far] {
        const Pattern p;
        const Surprise exact = surprise(p.bands, p.seen);
        const Surprise drawn = surprise(p.bands, p.seen, uniform, {1, 1000});
        RC_ASSERT(!drawn.exact);
        RC_ASSERT((drawn.probability > 0.0).all());
        RC_ASSERT((drawn.probability <= 1.0).all());
        const Eigen::ArrayXd distance = (drawn.probability - exact.probability).abs() / drawn.error;
        RC_ASSERT(distance.maxCoeff() < 6.0);
        far += static_cast<int>((distance > 2.0).count());
    }));
    // Of 3000; one in twenty at most is expected beyond two errors, and some are, or the errors are too
    // large.
    EXPECT_LT(far, 250);
    EXPECT_GT(far, 10);
}

TEST(Surprise, DrawnIsTheSameEveryTime) {
    const std::vector<Eigen::ArrayXXd> bands(3, Eigen::ArrayXXd::Constant(4, 2, 0.25));
    const std::vector<BandIndex> seen(3);
    const Surprise once = surprise(bands, seen, uniform, {1, 100});
    EXPECT_TRUE((once.probability == surprise(bands, seen, uniform, {1, 100}).probability).all());
    EXPECT_TRUE((once.probability == 1.0).all());  // all patterns tie
    EXPECT_TRUE((once.error == 0.01).all());       // as 100 draws cannot tell 1 from 0.99
}

TEST(Surprise, IsDrawnOnlyBeyondTheLimitOfAHalf) {
    // Bands 5, 3, 2, 2: the halves take 5, then 3, then 2 to the smaller (3), then 2 to the 5: 10 and 6.
    std::vector<Eigen::ArrayXXd> bands;
    for (const int count : {2, 5, 2, 3}) {
        bands.emplace_back(Eigen::ArrayXXd::Constant(count, 1, 1.0 / count));
    }
    const std::vector<BandIndex> seen(4);
    EXPECT_TRUE(surprise(bands, seen, uniform, {10, 10}).exact);
    EXPECT_FALSE(surprise(bands, seen, uniform, {9, 10}).exact);
}

TEST(Surprise, IsZeroUnderACauseThatCannotShowThePattern) {
    const Eigen::ArrayXXd table = (Eigen::ArrayXXd(2, 2) << 0.0, 0.5, 1.0, 0.5).finished();
    const std::vector<Eigen::ArrayXXd> bands = {table, table};
    const std::vector<BandIndex> seen = {BandIndex{0}, BandIndex{1}};
    EXPECT_TRUE((surprise(bands, seen).probability == array({0.0, 1.0})).all());
    const Surprise drawn = surprise(bands, seen, uniform, {1, 100});
    EXPECT_TRUE((drawn.probability == array({0.0, 1.0})).all());
    EXPECT_EQ(drawn.error(0), 0.0);
}

TEST(Surprise, IsExactForTwelveFindingsOfUpToSevenBands) {
    // Twelve findings that are 2, 3, .. 7 bands of equal size but for the first band, which is half as likely
    // as the others: the probability depends on the number of first bands seen alone, j of them P ~ 2^-j.
    std::vector<Eigen::ArrayXXd> bands;
    std::vector<long double> first_bands = {1.0L};  // P(j first bands)
    for (int f = 0; f < 12; ++f) {
        const int count = 2 + f % 6;
        Eigen::ArrayXXd table = Eigen::ArrayXXd::Constant(count, 1, 2.0 / (2 * count - 1));
        table(0, 0) /= 2.0;
        bands.push_back(table);
        const long double chance = 1.0L / (2 * count - 1);
        first_bands.push_back(0.0L);
        for (std::size_t j = first_bands.size() - 1; j > 0; --j) {
            first_bands[j] = first_bands[j] * (1.0L - chance) + first_bands[j - 1] * chance;
        }
        first_bands[0] *= 1.0L - chance;
    }
    for (const std::size_t firsts : {0U, 3U, 8U, 12U}) {
        std::vector<BandIndex> seen(12, BandIndex{1});
        std::fill_n(seen.begin(), firsts, BandIndex{0});
        long double want = 0.0L;
        for (std::size_t j = firsts; j <= 12; ++j) {
            want += first_bands[j];
        }
        const Surprise got = surprise(bands, seen);
        EXPECT_TRUE(got.exact);
        EXPECT_TRUE(near_rel(static_cast<double>(want), got.probability(0), 1e-12)) << firsts;
    }
}

// ---- the cause unknown ----

TEST(PredictiveCheck, IsThatOfFullEnumeration) {
    EXPECT_TRUE(rc::check([] {
        const Pattern p;
        const Eigen::ArrayXd prior = random_share(3);
        long double observed = 0.0L;
        for (Eigen::Index k = 0; k < 3; ++k) {
            observed += prior(k) * probability_given(p, k);
        }
        long double sum = 0.0L;
        long double squares = 0.0L;
        for (const auto& outcome : all_outcomes(p.bands)) {
            const long double probability =
                prior(0) * outcome[0] + prior(1) * outcome[1] + prior(2) * outcome[2];
            sum += probability <= observed * (1.0L + 1e-9L) ? probability : 0.0L;
            squares += probability * probability;
        }
        const PredictiveCheck got = predictive_check(prior, p.bands, p.seen);
        RC_ASSERT(std::abs(got.probability / static_cast<double>(observed) - 1.0) < 1e-13);
        RC_ASSERT(std::abs(got.p_value.value() / static_cast<double>(sum) - 1.0) < 1e-12);
        RC_ASSERT(std::abs(got.surprise_index / static_cast<double>(squares / observed) - 1.0) < 1e-12);
    }));
}

TEST(PredictiveCheck, OfACertainCauseIsItsSurprise) {
    EXPECT_TRUE(rc::check([] {
        const Pattern p;
        const PredictiveCheck got = predictive_check(array({0.0, 1.0, 0.0}), p.bands, p.seen);
        RC_ASSERT(std::abs(got.p_value.value() - surprise(p.bands, p.seen).probability(1)) < 1e-13);
    }));
}

TEST(PredictiveCheck, GivesNoPValueBeyondTheLimitButStillTheIndex) {
    const std::vector<Eigen::ArrayXXd> bands(
        40, Eigen::ArrayXXd::Constant(4, 2, 0.25));  // 4^40 overflows 64 bits
    const PredictiveCheck large = predictive_check(array({0.5, 0.5}), bands, std::vector<BandIndex>(40));
    EXPECT_FALSE(large.p_value.has_value());
    EXPECT_TRUE(near_rel(1.0, large.surprise_index, 1e-12));
    const std::vector<Eigen::ArrayXXd> two(bands.begin(), bands.begin() + 2);
    EXPECT_TRUE(predictive_check(array({0.5, 0.5}), two, std::vector<BandIndex>(2), 16).p_value.has_value());
    EXPECT_FALSE(predictive_check(array({0.5, 0.5}), two, std::vector<BandIndex>(2), 15).p_value.has_value());
}

TEST(PredictiveCheck, FindsAnImpossiblePatternInfinitelySurprising) {
    const Eigen::ArrayXXd table = (Eigen::ArrayXXd(2, 2) << 0.0, 0.0, 1.0, 1.0).finished();
    const PredictiveCheck got = predictive_check(array({0.5, 0.5}), {table}, {BandIndex{0}});
    EXPECT_EQ(got.probability, 0.0);
    EXPECT_EQ(got.p_value, 0.0);
    EXPECT_EQ(got.surprise_index, infinity);
}

// ---- what is refused ----

TEST(Fit, NamesWhatIsWrong) {
    const Eigen::ArrayXd prior = array({0.5, 0.5});
    const Eigen::ArrayXXd table = Eigen::ArrayXXd::Constant(2, 2, 0.5);
    const Eigen::ArrayXXd wide = Eigen::ArrayXXd::Constant(2, 3, 0.5);
    const Eigen::ArrayXXd short_column = (Eigen::ArrayXXd(2, 2) << 0.5, 0.5, 0.5, 0.4).finished();
    const std::vector<BandIndex> seen(2);

    expect_domain_error(
        [&] {
            (void)conflict(array({0.5, 0.4}), table.log());
        },
        "conflict", "prior sum", {}, 0.9, "1 within 1e-09");
    expect_domain_error([&] { (void)conflict(prior, wide.log()); }, "conflict", "loglik columns size", {},
                        3.0, "2");
    const Eigen::ArrayXXd above = (Eigen::ArrayXXd(2, 2) << -1.0, -1.0, -1.0, 0.5).finished();
    expect_domain_error([&] { (void)conflict(prior, above); }, "conflict", "loglik", {1, 1}, 0.5, "<= 0");
    const Eigen::ArrayXXd unknown = (Eigen::ArrayXXd(1, 2) << nan, -1.0).finished();
    expect_domain_error([&] { (void)conflict(prior, unknown); }, "conflict", "loglik", {0, 0}, nan, "<= 0");
    const Eigen::ArrayXXd impossible = (Eigen::ArrayXXd(2, 2) << -infinity, 0.0, 0.0, -infinity).finished();
    expect_domain_error([&] { (void)conflict(prior, impossible); }, "conflict", "loglik", {}, -infinity,
                        "possible under some cause of the prior");

    expect_domain_error([&] { (void)surprise({}, {}); }, "surprise", "bands size", {}, 0.0, "at least 1");
    expect_domain_error([&] { (void)surprise({Eigen::ArrayXXd(2, 0)}, {BandIndex{0}}); }, "surprise",
                        "bands columns size", {}, 0.0, "at least 1");
    expect_domain_error([&] { (void)surprise({table}, seen); }, "surprise", "seen size", {}, 2.0, "1");
    expect_domain_error(
        [&] {
            (void)surprise({table, wide}, seen);
        },
        "surprise", "bands columns size", {}, 3.0, "2");
    expect_domain_error(
        [&] {
            (void)surprise({table, short_column}, seen);
        },
        "surprise", "bands column sum", {{}, 1}, 0.9, "1 within 1e-9");
    expect_domain_error([&] { (void)surprise({table}, {BandIndex{2}}); }, "surprise", "seen", {}, 2.0,
                        "between 0 and 1");
    expect_domain_error(
        [&] {
            (void)surprise({table, table}, seen, {}, {1, 10});
        },
        "surprise", "uniform", {}, 0.0, "given for more outcomes than the limit");
    const auto one = [](std::uint64_t, std::uint32_t) { return 1.0; };
    expect_domain_error(
        [&] {
            (void)surprise({table, table}, seen, one, {1, 10});
        },
        "surprise", "uniform", {}, 1.0, "in (0, 1)");
    expect_domain_error(
        [&] {
            (void)surprise({table, table}, seen, uniform, {1, 0});
        },
        "surprise", "draws", {}, 0.0, "between 1 and 1e+12");
    expect_domain_error([&] { (void)predictive_check(prior, {}, {}); }, "predictive_check", "bands size", {},
                        0.0, "at least 1");
    expect_domain_error([&] { (void)predictive_check(prior, {wide}, {BandIndex{0}}); }, "predictive_check",
                        "bands columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)predictive_check(prior, {table}, {BandIndex{-1}}); }, "predictive_check",
                        "seen", {}, -1.0, "between 0 and 1");
}

}  // namespace
