// SPDX-License-Identifier: Apache-2.0
#include "steelyard/priors/prior_set.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <stdexcept>

#include "near.hpp"
#include "steelyard/priors/odds.hpp"
#include "text_of.hpp"

namespace steelyard::priors {
namespace {

using test::near_rel;
using test::near_ulps;
using test::set_text;

PriorSet read(const std::string& text) {
    return read_prior_set(text, "test.yaml");
}

PriorSet three_weights() {
    return read(
        "format: steelyard.prior-set/1\ntitle: t\ngiven_as: weights\nworth: 10\ncauses:\n"
        "  proximal: {weight: 20, range: [10, 30]}\n  renal_failure: {weight: 30}\n  extrarenal: {weight: "
        "50}\n");
}

TEST(PriorSet, FindsACauseByItsId) {
    const PriorSet set = three_weights();
    ASSERT_NE(set.find("renal_failure"), nullptr);
    EXPECT_EQ(set.find("renal_failure")->given, 30.0);
    EXPECT_EQ(set.find("renal"), nullptr);
}

TEST(PriorSet, LogPriorIsTheLogarithmInTheOrderOfTheCauses) {
    const Eigen::ArrayXd logs = three_weights().log_prior();
    ASSERT_EQ(logs.size(), 3);
    EXPECT_TRUE(near_ulps(std::log(0.2), logs(0), 2));
    EXPECT_TRUE(near_ulps(std::log(0.3), logs(1), 2));
    EXPECT_TRUE(near_ulps(std::log(0.5), logs(2), 2));
}

TEST(Without, KeepsTheProportionsOfTheRest) {
    EXPECT_TRUE(rc::check("ratios of what stays", [] {
        const int causes = *rc::gen::inRange(3, 9);
        std::vector<std::pair<std::string, std::string>> given;
        for (int i = 0; i < causes; ++i) {
            given.emplace_back("cause_" + std::to_string(i), std::to_string(*rc::gen::inRange(1, 100'000)));
        }
        const bool as_counts = *rc::gen::arbitrary<bool>();
        const PriorSet set =
            read(set_text(as_counts ? "counts" : "weights", as_counts ? "count" : "weight", given));
        std::vector<std::string> leave_out;
        for (int i = 0; i + 2 < causes; ++i) {
            if (*rc::gen::arbitrary<bool>()) {
                leave_out.push_back("cause_" + std::to_string(i));
            }
        }
        const PriorSet rest = without(set, leave_out);
        RC_ASSERT(rest.causes.size() + leave_out.size() == set.causes.size());
        const PriorCause& last = rest.causes.back();
        double sum = 0.0;
        for (const PriorCause& cause : rest.causes) {
            const double before = set.find(cause.id)->probability / set.find(last.id)->probability;
            RC_ASSERT(static_cast<bool>(near_rel(before, cause.probability / last.probability, 1e-14)));
            RC_ASSERT(cause.given == set.find(cause.id)->given);
            sum += cause.probability;
        }
        RC_ASSERT(static_cast<bool>(near_rel(1.0, sum, 1e-14)));
    }));
}

TEST(Without, LeavesTheSetAloneWhenNothingIsLeftOut) {
    const PriorSet set = three_weights();
    const PriorSet same = without(set, {});
    EXPECT_EQ(same.ids(), set.ids());
    EXPECT_EQ(same.worth, set.worth);
    EXPECT_EQ(same.causes[0].probability, set.causes[0].probability);
}

TEST(Without, IsTheSameInOneStepOrTwo) {
    const PriorSet set =
        read(set_text("weights", "weight", {{"a", "1"}, {"b", "2"}, {"c", "3"}, {"d", "4"}}));
    const PriorSet one = without(set, {"a", "c"});
    const PriorSet two = without(without(set, {"c"}), {"a"});
    ASSERT_EQ(one.ids(), two.ids());
    EXPECT_TRUE(near_ulps(1.0 / 3.0, one.causes[0].probability, 4));
    EXPECT_TRUE(near_ulps(one.causes[0].probability, two.causes[0].probability, 4));
}

TEST(Without, ShrinksTheWorthToTheShareThatStays) {
    // Worth 10 with half of it on extrarenal: 5 patients stay.
    EXPECT_TRUE(near_ulps(5.0, without(three_weights(), {"extrarenal"}).worth, 2));
    const PriorSet counts =
        read(set_text("counts", "count", {{"proximal", "3"}, {"renal_failure", "7"}, {"extrarenal", "20"}}));
    EXPECT_EQ(without(counts, {"extrarenal"}).worth, 10.0);
}

TEST(Without, RestatesOddsAgainstTheSmallerRest) {
    // 1/4, 1/4, 1/2. Without the last the two are even, and the range moves by the same factor 3.
    const PriorSet set = read(
        "format: steelyard.prior-set/1\ntitle: t\ngiven_as: odds_against_rest\ncauses:\n"
        "  proximal: {odds: \"1:3\", range: [\"1:6\", \"1:2\"]}\n  renal_failure: {odds: \"1:3\"}\n"
        "  extrarenal: {odds: \"1:1\"}\n");
    const PriorSet rest = without(set, {"extrarenal"});
    EXPECT_TRUE(near_ulps(0.5, rest.causes[0].probability, 2));
    EXPECT_TRUE(near_rel(1.0, rest.causes[0].given, 1e-14));
    EXPECT_EQ(rest.causes[0].as_given, "1:1");
    EXPECT_EQ(rest.causes[0].range_as_given, "1:2 to 1.5:1");
    ASSERT_TRUE(rest.causes[0].range_low);
    EXPECT_TRUE(near_rel(0.5, *rest.causes[0].range_low, 1e-14));
    EXPECT_TRUE(near_rel(1.5, *rest.causes[0].range_high, 1e-14));
    EXPECT_EQ(rest.given_sum, 1.0);
}

TEST(Without, RefusesACauseThatIsNotOfTheSet) {
    try {
        static_cast<void>(without(three_weights(), {"proximle"}));
        FAIL() << "not a cause of the set";
    } catch (const std::invalid_argument& error) {
        EXPECT_STREQ(error.what(), "the prior set has no cause 'proximle' to leave out");
    }
}

TEST(Without, RefusesToLeaveFewerThanTwo) {
    EXPECT_THROW(static_cast<void>(without(three_weights(), {"proximal", "extrarenal"})),
                 std::invalid_argument);
    EXPECT_THROW(static_cast<void>(without(three_weights(), {"proximal", "renal_failure", "extrarenal"})),
                 std::invalid_argument);
}

TEST(GivenAs, IsWrittenAsInTheFiles) {
    EXPECT_EQ(to_string(GivenAs::odds_against_rest), "odds_against_rest");
    EXPECT_EQ(to_string(GivenAs::weights), "weights");
    EXPECT_EQ(to_string(GivenAs::counts), "counts");
}

}  // namespace
}  // namespace steelyard::priors
