// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/information.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "random_tables.hpp"
#include "steelyard/engine/log_math.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::array;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::random_share;
using steelyard::test::random_table;

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double round_off = 1e-13;  // bits, as the header states

/// Entropy [bits] in long double.
long double entropy_of(const std::vector<long double>& weights) {
    long double sum = 0.0L;
    for (const long double w : weights) {
        sum += w;
    }
    long double bits = 0.0L;
    for (const long double w : weights) {
        bits -= w > 0.0L ? w / sum * std::log2(w / sum) : 0.0L;
    }
    return bits;
}

/// H(now) - sum over outcomes of P(outcome) H(after) in long double, with one table or two.
double entropy_drop(const Eigen::ArrayXd& now, const std::vector<Eigen::ArrayXXd>& tables) {
    std::vector<std::vector<long double>> branches = {{now.data(), now.data() + now.size()}};
    long double drop = entropy_of(branches.front());
    for (const Eigen::ArrayXXd& table : tables) {
        std::vector<std::vector<long double>> longer;
        for (const auto& branch : branches) {
            for (Eigen::Index b = 0; b < table.rows(); ++b) {
                longer.push_back(branch);
                for (std::size_t k = 0; k < branch.size(); ++k) {
                    longer.back()[k] *= table(b, static_cast<Eigen::Index>(k));
                }
            }
        }
        branches = longer;
    }
    for (const auto& branch : branches) {
        long double probability = 0.0L;
        for (const long double w : branch) {
            probability += w;
        }
        drop -= probability > 0.0L ? probability * entropy_of(branch) : 0.0L;
    }
    return static_cast<double>(drop);
}

Eigen::Index small(Eigen::Index least, Eigen::Index most) {
    return *rc::gen::inRange<Eigen::Index>(least, most + 1);
}

/// A random problem: 2 to 8 causes; 3 findings of 1 to 7 bands. Zeros occur.
struct Problem {
    Eigen::Index causes = small(2, 8);
    Eigen::ArrayXd now = random_share(causes, 0);
    std::vector<Eigen::ArrayXXd> tables = {random_table(small(1, 7), causes, 0),
                                           random_table(small(1, 7), causes, 0),
                                           random_table(small(1, 7), causes, 0)};
};

/// The same row for every cause.
Eigen::ArrayXXd flat_table(Eigen::Index causes) {
    return random_share(5, 0).replicate(1, causes);
}

/// Columns (or entries) in another order.
Eigen::ArrayXXd relabelled(const Eigen::ArrayXXd& table) {
    return table.rowwise().reverse();
}

// ---- entropy and divergence ----

TEST(EntropyBits, OfEqualSharesIsTheLogarithmOfTheirNumberAndOfCertaintyZero) {
    EXPECT_EQ(entropy_bits(Eigen::ArrayXd::Constant(8, 0.125)), 3.0);
    EXPECT_EQ(entropy_bits(array({0.0, 1.0, 0.0})), 0.0);
    EXPECT_EQ(entropy_bits(array({1.0})), 0.0);
    EXPECT_EQ(entropy_bits(array({0.5, 0.25, 0.25})), 1.5);
}

TEST(DivergenceBits, IsTheHandComputedOne) {
    EXPECT_TRUE(near_rel(0.5 + 0.5 * std::log2(2.0 / 3.0),
                         divergence_bits(array({0.5, 0.5}), array({0.25, 0.75})), 1e-14));
    EXPECT_EQ(divergence_bits(array({0.0, 1.0}), array({0.5, 0.5})), 1.0);
    EXPECT_EQ(divergence_bits(array({0.5, 0.5}), array({0.0, 1.0})), infinity);
    EXPECT_EQ(divergence_bits(array({0.0, 1.0}), array({0.0, 1.0})), 0.0);
}

TEST(DivergenceBits, FromAnythingToItselfIsZeroAndElseNotNegative) {
    EXPECT_TRUE(rc::check([] {
        const Eigen::ArrayXd p = random_share(5, 0);
        const Eigen::ArrayXd q = random_share(5, 0);
        RC_ASSERT(divergence_bits(p, p) == 0.0);
        RC_ASSERT(divergence_bits(p, q) >= 0.0);
    }));
}

// ---- one finding ----

TEST(ExpectedInformation, IsTheExpectedDropOfEntropy) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const ExpectedInformation got = expected_information(p.now, p.tables[0]);
        RC_ASSERT(got.bits >= 0.0);
        RC_ASSERT(std::abs(got.bits - entropy_drop(p.now, {p.tables[0]})) < round_off);
    }));
}

TEST(ExpectedInformation, IsTheExpectedDivergenceOfThePosteriorFromNow) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const ExpectedInformation got = expected_information(p.now, p.tables[0]);
        double expected = 0.0;
        for (Eigen::Index b = 0; b < got.after.cols(); ++b) {
            expected += got.band_probability(b) * divergence_bits(got.after.col(b), p.now);
        }
        RC_ASSERT(std::abs(got.bits - expected) < round_off);
    }));
}

TEST(ExpectedInformation, GivesPosteriorsThatAverageToNow) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const ExpectedInformation got = expected_information(p.now, p.tables[0]);
        const Eigen::ArrayXd average = (got.after.matrix() * got.band_probability.matrix()).array();
        RC_ASSERT((average - p.now).abs().maxCoeff() < 1e-14);
        RC_ASSERT((got.after.colwise().sum() - 1.0).abs().maxCoeff() < 1e-14);
    }));
}

TEST(ExpectedInformation, OfAFlatFindingIsZero) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const ExpectedInformation got = expected_information(p.now, flat_table(p.causes));
        RC_ASSERT(got.bits >= 0.0);
        RC_ASSERT(got.bits < round_off);
    }));
}

TEST(ExpectedInformation, DoesNotKnowTheOrderOfCauses) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const ExpectedInformation got = expected_information(p.now, p.tables[0]);
        const ExpectedInformation turned = expected_information(p.now.reverse(), relabelled(p.tables[0]));
        RC_ASSERT(std::abs(got.bits - turned.bits) < round_off);
        RC_ASSERT((got.band_probability - turned.band_probability).abs().maxCoeff() < 1e-14);
        RC_ASSERT((got.after - turned.after.colwise().reverse()).abs().maxCoeff() < 1e-14);
    }));
}

TEST(ExpectedInformation, LeavesTheCausesAsTheyAreAfterABandThatCannotBe) {
    const Eigen::ArrayXd now = array({0.3, 0.7, 0.0});
    const Eigen::ArrayXXd rows = (Eigen::ArrayXXd(2, 3) << 0.0, 0.0, 1.0, 1.0, 1.0, 0.0).finished();
    const ExpectedInformation got = expected_information(now, rows);
    EXPECT_EQ(got.band_probability(0), 0.0);
    EXPECT_TRUE((got.after.col(0) == now).all());
    EXPECT_EQ(got.bits, 0.0);
}

// ---- change of leader ----

TEST(LeaderChangeChance, AddsTheBandsAfterWhichAnotherCauseIsAhead) {
    const Eigen::ArrayXXd after =
        (Eigen::ArrayXXd(3, 3) << 0.6, 0.2, 0.4, 0.3, 0.5, 0.2, 0.1, 0.3, 0.4).finished();
    const Eigen::ArrayXd probability = array({0.5, 0.3, 0.2});
    EXPECT_EQ(leader_change_chance(probability, after, CauseIndex{0}), 0.3);  // the last band ties
    EXPECT_EQ(leader_change_chance(probability, after, CauseIndex{1}), 0.7);
    EXPECT_EQ(leader_change_chance(probability, after, CauseIndex{2}), 0.8);
}

TEST(LeaderChangeChance, CountsALeadAboveOnePartInATrillion) {
    const auto chance = [](double ahead) {
        const Eigen::ArrayXXd after = (Eigen::ArrayXXd(2, 1) << 0.5, 0.5 * (1.0 + ahead)).finished();
        return leader_change_chance(array({1.0}), after, CauseIndex{0});
    };
    EXPECT_EQ(chance(0.9e-12), 0.0);
    EXPECT_EQ(chance(1.1e-12), 1.0);
}

// ---- evidence weighed anew ----

TEST(ReweightedInformation, WithBayesPosteriorsIsTheExpectedInformation) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const ExpectedInformation bayes = expected_information(p.now, p.tables[0]);
        Eigen::Index leader = 0;
        p.now.maxCoeff(&leader);
        const ReweightedInformation got =
            reweighted_information(p.now, p.tables[0], bayes.after, CauseIndex{leader});
        RC_ASSERT(got.bits >= 0.0);
        RC_ASSERT(std::abs(got.bits - bayes.bits) < round_off);
        RC_ASSERT((got.band_probability == bayes.band_probability).all());
        RC_ASSERT(got.leader_changes ==
                  leader_change_chance(bayes.band_probability, bayes.after, CauseIndex{leader}));
    }));
}

TEST(ReweightedInformation, IsTheHandComputedOne) {
    // H(1/2, 1/4, 1/4) = 1.5 bits; bands of probability 5/8 and 3/8; afterwards 1 bit and 0 bits.
    const Eigen::ArrayXXd rows = (Eigen::ArrayXXd(2, 3) << 1.0, 0.5, 0.0, 0.0, 0.5, 1.0).finished();
    const Eigen::ArrayXXd after = (Eigen::ArrayXXd(3, 2) << 0.5, 0.0, 0.5, 0.0, 0.0, 1.0).finished();
    const ReweightedInformation got =
        reweighted_information(array({0.5, 0.25, 0.25}), rows, after, CauseIndex{0});
    EXPECT_TRUE(near_rel(1.5 - 0.625, got.bits, 1e-15));
    EXPECT_EQ(got.leader_changes, 0.375);
}

TEST(ReweightedInformation, IsNoneWhenTheEntropyIsExpectedToRise) {
    const ReweightedInformation got =
        reweighted_information(array({0.9, 0.1}), Eigen::ArrayXXd::Constant(2, 2, 0.5),
                               Eigen::ArrayXXd::Constant(2, 2, 0.5), CauseIndex{0});
    EXPECT_EQ(got.bits, 0.0);
    EXPECT_EQ(got.leader_changes, 0.0);
}

// ---- two findings ----

TEST(PairInformation, IsTheDropOfEntropyOverJointOutcomes) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const double got = pair_information(p.now, p.tables[0], p.tables[1]);
        RC_ASSERT(got >= 0.0);
        RC_ASSERT(std::abs(got - entropy_drop(p.now, {p.tables[0], p.tables[1]})) < round_off);
    }));
}

TEST(PairInformation, IsAtLeastThatOfEitherAndAtMostTheSumOfBoth) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const double first = expected_information(p.now, p.tables[0]).bits;
        const double second = expected_information(p.now, p.tables[1]).bits;
        const double both = pair_information(p.now, p.tables[0], p.tables[1]);
        RC_ASSERT(both >= std::max(first, second) - round_off);
        RC_ASSERT(both <= first + second + round_off);
        RC_ASSERT(std::abs(both - pair_information(p.now, p.tables[1], p.tables[0])) < round_off);
    }));
}

TEST(PairInformation, WithAFlatFindingIsThatOfTheOther) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        RC_ASSERT(std::abs(pair_information(p.now, p.tables[0], flat_table(p.causes)) -
                           expected_information(p.now, p.tables[0]).bits) < round_off);
    }));
}

TEST(PairInformation, DoesNotKnowTheOrderOfCauses) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        RC_ASSERT(std::abs(pair_information(p.now, p.tables[0], p.tables[1]) -
                           pair_information(p.now.reverse(), relabelled(p.tables[0]),
                                            relabelled(p.tables[1]))) < round_off);
    }));
}

/// max(0, H(now) - sum P(b, c) H(after)) with every posterior by softmax().
double by_softmax(const Eigen::ArrayXd& now, const Eigen::ArrayXd& base, const Eigen::ArrayXXd& first_loglik,
                  const Eigen::ArrayXXd& second_loglik, const Eigen::ArrayXXd& first_rows,
                  const Eigen::ArrayXXd& second_rows) {
    double bits = entropy_bits(now);
    for (Eigen::Index b = 0; b < first_rows.rows(); ++b) {
        for (Eigen::Index c = 0; c < second_rows.rows(); ++c) {
            const double probability =
                (now * first_rows.row(b).transpose() * second_rows.row(c).transpose()).sum();
            const Eigen::ArrayXd scores =
                base + first_loglik.row(b).transpose() + second_loglik.row(c).transpose();
            bits -= probability * entropy_bits(softmax(scores));
        }
    }
    return std::max(0.0, bits);
}

TEST(ReweightedPairInformation, WithFullWeightsIsThePairInformation) {
    EXPECT_TRUE(rc::check([] {
        const Eigen::ArrayXd now = random_share(4);
        const Eigen::ArrayXXd first = random_table(5, 4);
        const Eigen::ArrayXXd second = random_table(3, 4);
        const double got =
            reweighted_pair_information(now, now.log() + 17.0, first.log(), second.log(), first, second);
        RC_ASSERT(std::abs(got - pair_information(now, first, second)) < round_off);
    }));
}

TEST(ReweightedPairInformation, IsTheDropOfEntropyWithPosteriorsBySoftmax) {
    EXPECT_TRUE(rc::check([] {
        const Eigen::ArrayXd now = random_share(4, 0);
        const Eigen::ArrayXd base = random_share(4).log() * 3.0;
        const Eigen::ArrayXXd first = random_table(5, 4);
        const Eigen::ArrayXXd second = random_table(3, 4);
        const double weight = *rc::gen::inRange(1, 101) * 0.01;
        const double got = reweighted_pair_information(now, base, weight * first.log(), weight * second.log(),
                                                       first, second);
        RC_ASSERT(got >= 0.0);
        RC_ASSERT(std::abs(got - by_softmax(now, base, weight * first.log(), weight * second.log(), first,
                                            second)) < round_off);
    }));
}

TEST(ReweightedPairInformation, SurvivesFindingsThatRuleOutEachOthersCauses) {
    const Eigen::ArrayXXd rows = Eigen::ArrayXXd::Constant(2, 2, 0.5);
    const Eigen::ArrayXXd for_first = (Eigen::ArrayXXd(2, 2) << 0.0, -1000.0, 0.0, -0.5).finished();
    const Eigen::ArrayXXd for_second = (Eigen::ArrayXXd(2, 2) << -1001.0, 0.0, -700.0, 0.0).finished();
    const Eigen::ArrayXd now = array({0.5, 0.5});
    const Eigen::ArrayXd base = array({-1000.0, -1000.5});
    const double expected = by_softmax(now, base, for_first, for_second, rows, rows);
    EXPECT_GT(expected, 0.5);
    EXPECT_LT(expected, 0.9);  // one of the four outcomes leaves doubt
    EXPECT_TRUE(near_abs(expected, reweighted_pair_information(now, base, for_first, for_second, rows, rows),
                         round_off));
}

// ---- choice ----

TEST(FirstBest, TakesTheFirstOfThoseThatTie) {
    EXPECT_EQ(first_best(array({0.1, 0.3, 0.3 + 0.9e-12})).value, 1);
    EXPECT_EQ(first_best(array({0.1, 0.3, 0.3 + 1.1e-12})).value, 2);
    EXPECT_EQ(first_best(array({0.0})).value, 0);
}

TEST(BestPair, IsNoWorseThanAnyOtherPair) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const FindingPair best = best_pair(p.now, p.tables);
        RC_ASSERT(best.first < best.second);
        for (std::size_t f = 0; f < 3; ++f) {
            for (std::size_t g = f + 1; g < 3; ++g) {
                RC_ASSERT(best.bits >= pair_information(p.now, p.tables[f], p.tables[g]) - information_tie);
            }
        }
        RC_ASSERT(
            std::abs(best.bits - pair_information(p.now, p.tables[static_cast<std::size_t>(best.first.value)],
                                                  p.tables[static_cast<std::size_t>(best.second.value)])) <
            round_off);
    }));
}

TEST(TwoStepPlan, IsAtLeastAsGoodAsAnyFixedPartner) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const TwoStepPlan plan = two_step_plan(p.now, p.tables, FindingIndex{1});
        RC_ASSERT(plan.bits >= pair_information(p.now, p.tables[1], p.tables[0]) - 2e-12);
        RC_ASSERT(plan.bits >= pair_information(p.now, p.tables[1], p.tables[2]) - 2e-12);
        RC_ASSERT(plan.bits <= entropy_bits(p.now) + round_off);
    }));
}

TEST(TwoStepPlan, IsWhatEachBandsBestSecondTells) {
    EXPECT_TRUE(rc::check([] {
        const Problem p;
        const TwoStepPlan plan = two_step_plan(p.now, p.tables, FindingIndex{0});
        const ExpectedInformation step = expected_information(p.now, p.tables[0]);
        double bits = step.bits;
        RC_ASSERT(plan.second.size() == static_cast<std::size_t>(step.after.cols()));
        for (std::size_t band = 0; band < plan.second.size(); ++band) {
            const auto place = static_cast<Eigen::Index>(band);
            RC_ASSERT(plan.second[band].has_value() == (step.band_probability(place) > 0.0));
            if (plan.second[band]) {
                const double one = expected_information(step.after.col(place), p.tables[1]).bits;
                const double two = expected_information(step.after.col(place), p.tables[2]).bits;
                RC_ASSERT(plan.second[band]->value == (two > one + information_tie ? 2 : 1));
                bits += step.band_probability(place) * std::max(one, two);
            }
        }
        RC_ASSERT(std::abs(plan.bits - bits) < 1e-11);
    }));
}

TEST(TwoStepPlan, HasNoSecondAfterABandThatCannotBe) {
    const Eigen::ArrayXXd never = (Eigen::ArrayXXd(2, 2) << 0.0, 0.0, 1.0, 1.0).finished();
    const Eigen::ArrayXXd telling = (Eigen::ArrayXXd(2, 2) << 0.9, 0.2, 0.1, 0.8).finished();
    const TwoStepPlan plan = two_step_plan(array({0.5, 0.5}), {never, telling}, FindingIndex{0});
    EXPECT_FALSE(plan.second.at(0).has_value());
    EXPECT_EQ(plan.second.at(1), FindingIndex{1});
}

// ---- what is refused ----

TEST(Information, NamesWhatIsWrong) {
    const Eigen::ArrayXd now = array({0.5, 0.5});
    const Eigen::ArrayXXd rows = Eigen::ArrayXXd::Constant(2, 2, 0.5);
    const Eigen::ArrayXXd wide = Eigen::ArrayXXd::Constant(2, 3, 0.5);
    const Eigen::ArrayXXd short_column = (Eigen::ArrayXXd(2, 2) << 0.5, 0.5, 0.5, 0.4).finished();
    const Eigen::ArrayXXd negative = (Eigen::ArrayXXd(2, 2) << 0.5, 1.5, 0.5, -0.5).finished();
    const Eigen::ArrayXXd none(0, 2);
    const std::vector<Eigen::ArrayXXd> two = {rows, rows};

    expect_domain_error([&] { (void)entropy_bits(array({})); }, "entropy_bits", "probability size", {}, 0.0,
                        "at least 1");
    expect_domain_error(
        [&] {
            (void)entropy_bits(array({0.5, 0.4}));
        },
        "entropy_bits", "probability sum", {}, 0.9, "1 within 1e-09");
    expect_domain_error([&] { (void)divergence_bits(now, array({1.0})); }, "divergence_bits", "q size", {},
                        1.0, "2");
    expect_domain_error(
        [&] {
            (void)divergence_bits(array({nan, 1.0}), now);
        },
        "divergence_bits", "p", {0, {}}, nan, "finite and >= 0");
    expect_domain_error([&] { (void)expected_information(now, wide); }, "expected_information",
                        "rows columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)expected_information(now, none); }, "expected_information", "rows size",
                        {}, 0.0, "at least 1");
    expect_domain_error([&] { (void)expected_information(now, short_column); }, "expected_information",
                        "rows column sum", {{}, 1}, 0.9, "1 within 1e-9");
    expect_domain_error([&] { (void)expected_information(now, negative); }, "expected_information", "rows",
                        {0, 1}, 1.5, "between 0 and 1");
    expect_domain_error([&] { (void)leader_change_chance(now, wide, CauseIndex{0}); }, "leader_change_chance",
                        "after columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)leader_change_chance(now, rows, CauseIndex{2}); }, "leader_change_chance",
                        "leader", {}, 2.0, "between 0 and 1");
    expect_domain_error([&] { (void)reweighted_information(now, rows, short_column, CauseIndex{0}); },
                        "reweighted_information", "after column sum", {{}, 1}, 0.9, "1 within 1e-9");
    expect_domain_error([&] { (void)reweighted_information(now, rows, rows, CauseIndex{-1}); },
                        "reweighted_information", "leader", {}, -1.0, "between 0 and 1");
    expect_domain_error([&] { (void)reweighted_information(now, rows, wide, CauseIndex{0}); },
                        "reweighted_information", "after columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)pair_information(now, rows, wide); }, "pair_information",
                        "second columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)pair_information(now, negative, rows); }, "pair_information", "first",
                        {0, 1}, 1.5, "between 0 and 1");
    const Eigen::ArrayXXd log_rows = rows.log();
    const Eigen::ArrayXXd ruled_out = (Eigen::ArrayXXd(2, 2) << 0.0, 0.0, -infinity, 0.0).finished();
    expect_domain_error(
        [&] { (void)reweighted_pair_information(now, now.log(), log_rows, ruled_out, rows, rows); },
        "reweighted_pair_entropy", "second_loglik", {1, 0}, -infinity, "finite");
    expect_domain_error(
        [&] { (void)reweighted_pair_information(now, array({0.0}), log_rows, log_rows, rows, rows); },
        "reweighted_pair_entropy", "log_base size", {}, 1.0, "2");
    expect_domain_error(
        [&] { (void)reweighted_pair_information(now, now.log(), wide, log_rows, rows, rows); },
        "reweighted_pair_entropy", "first_loglik columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)first_best(array({})); }, "first_best", "bits size", {}, 0.0,
                        "at least 1");
    expect_domain_error(
        [&] {
            (void)first_best(array({0.0, nan}));
        },
        "first_best", "bits", {1, {}}, nan, "finite");
    expect_domain_error([&] { (void)best_pair(now, {rows}); }, "best_pair", "findings size", {}, 1.0,
                        "at least 2");
    expect_domain_error(
        [&] {
            (void)best_pair(now, {rows, wide});
        },
        "best_pair", "findings columns size", {}, 3.0, "2");
    expect_domain_error([&] { (void)two_step_plan(now, two, FindingIndex{2}); }, "two_step_plan", "first", {},
                        2.0, "between 0 and 1");
}

}  // namespace
