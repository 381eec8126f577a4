// SPDX-License-Identifier: Apache-2.0
#include "steelyard/priors/odds.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>

#include "near.hpp"

namespace steelyard::priors {
namespace {

using test::near_rel;
using test::near_ulps;

TEST(ParseOdds, ReadsARatioOrOneNumber) {
    EXPECT_EQ(parse_odds("1:3"), 1.0 / 3.0);
    EXPECT_EQ(parse_odds("3:1"), 3.0);
    EXPECT_EQ(parse_odds(" 1 : 4 "), 0.25);
    EXPECT_EQ(parse_odds("1:3.5"), 1.0 / 3.5);
    EXPECT_EQ(parse_odds("0.25"), 0.25);
    EXPECT_EQ(parse_odds("2e-3"), 0.002);
}

TEST(ParseOdds, RefusesEverythingElse) {
    for (const char* text :
         {"",     ":",     "1:",    ":3",   "1:2:3",  "0",       "0:1",          "1:0",
          "-1:3", "1:-3",  "-1:-3", "1/3",  "1 to 3", "0,5",     "25%",          "nan",
          "inf",  "1:inf", "1:nan", "1e13", "1e-13",  "1:1e300", "1e308:1e-308", "1e400"}) {
        EXPECT_FALSE(parse_odds(text)) << text;
    }
}

TEST(ParseOdds, ReachesBothBounds) {
    EXPECT_EQ(parse_odds("1e12"), most_given);
    EXPECT_EQ(parse_odds("1e-12"), least_given);
    EXPECT_TRUE(parse_odds("1:1e12"));
}

TEST(ProbabilityOfOdds, AgreesWithFractionsByHand) {
    // 1:3 is one chance in four, 1:1 one in two, 9:1 nine in ten.
    EXPECT_TRUE(near_ulps(0.25, probability_of_odds(1.0 / 3.0), 1));
    EXPECT_EQ(probability_of_odds(1.0), 0.5);
    EXPECT_EQ(probability_of_odds(9.0), 0.9);
    EXPECT_EQ(probability_of_odds(0.0), 0.0);
}

TEST(ProbabilityOfOdds, UndoesOddsOfProbability) {
    EXPECT_TRUE(rc::check("p -> odds -> p", [] {
        const double p = *rc::gen::inRange(1, 1'000'000) / 1e6;
        // 1 - p is exact for p >= 1/2 and loses at most half an ulp of 1 below; the three roundings add to 4
        // ulp.
        RC_ASSERT(static_cast<bool>(near_ulps(p, probability_of_odds(odds_of_probability(p)), 4)));
    }));
}

TEST(OddsText, PutsOneOnTheSmallerSide) {
    EXPECT_EQ(odds_text(1.0), "1:1");
    EXPECT_EQ(odds_text(1.0 / 3.4), "1:3.4");
    EXPECT_EQ(odds_text(2.3333), "2.33:1");
    EXPECT_EQ(odds_text(1.0 / 24.0), "1:24");
    EXPECT_EQ(odds_text(1e6), "1000000:1");
    EXPECT_EQ(odds_text(1.0 / 123456.0), "1:123000");
}

TEST(OddsText, StaysWithinTheBounds) {
    EXPECT_EQ(odds_text(1e-300), "1:1000000000000");
    EXPECT_EQ(odds_text(1e300), "1000000000000:1");
}

TEST(OddsText, ReadsBackToWithinHalfAPercent) {
    EXPECT_TRUE(rc::check("odds -> text -> odds", [] {
        const double odds = std::pow(10.0, *rc::gen::inRange(-1200, 1201) / 100.0);
        const auto back = parse_odds(odds_text(odds));
        RC_ASSERT(back.has_value());
        // Three significant digits: at worst 1.005 written as 1.00 or 1.01.
        RC_ASSERT(static_cast<bool>(near_rel(odds, *back, 0.005 + 1e-12)));
    }));
}

}  // namespace
}  // namespace steelyard::priors
