// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/numbers.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>

#include "steelyard/cli/report.hpp"

namespace steelyard::cli {
namespace {

TEST(Percent, NeverSaysNoneOrAll) {
    EXPECT_EQ(percent(0.0), "<1 %");
    EXPECT_EQ(percent(0.0049), "<1 %");
    EXPECT_EQ(percent(0.0051), "1 %");
    EXPECT_EQ(percent(0.37), "37 %");
    EXPECT_EQ(percent(0.9949), "99 %");
    EXPECT_EQ(percent(0.995), ">99 %");
    EXPECT_EQ(percent(1.0), ">99 %");
    EXPECT_TRUE(rc::check("no 0 % and no 100 %", [] {
        const double p = static_cast<double>(*rc::gen::inRange(0, 1'000'001)) / 1e6;
        RC_ASSERT((percent(p) != "0 %" && percent(p) != "100 %"));
    }));
}

TEST(Plain, WritesDecimalsAsALaboratoryDoes) {
    EXPECT_EQ(plain(2.8), "2.8");
    EXPECT_EQ(plain(139.0), "139");
    EXPECT_EQ(plain(0.123456), "0.1235");
    EXPECT_EQ(plain(25000.0), "25000");
    EXPECT_EQ(plain(-20.0), "-20");
}

TEST(SignedFixed, HasASignExceptAtZero) {
    EXPECT_EQ(signed_fixed(5.13, 1), "+5.1");
    EXPECT_EQ(signed_fixed(-0.33, 1), "-0.3");
    EXPECT_EQ(signed_fixed(0.01, 1), "0.0");
    EXPECT_EQ(signed_fixed(-0.01, 1), "0.0");
}

TEST(InWords, NamesLimitsAsLimits) {
    EXPECT_EQ(in_words(likelihoods::Interval::point(2.8)), "2.8");
    EXPECT_EQ(in_words({0.0, 5.0, false, true, true, false}), "below 5");
    EXPECT_EQ(in_words({20.0, 100.0, true, false, false, true}), "above 20");
}

TEST(UnitShown, IsTheTradesSpelling) {
    EXPECT_EQ(unit_shown("mm[Hg]"), "mmHg");
    EXPECT_EQ(unit_shown("[pH]"), "");
    EXPECT_EQ(unit_shown("mmol/L"), "mmol/L");
}

TEST(Decibans, AgreeWithTheTunnyReport) {
    // General Report on Tunny, 1945, p. 103 (transcription): 13 db up is 20 to 1 on, 4 db is 5 to 2 on.
    EXPECT_NEAR(decibans(std::log(20.0)), 13.0, 0.02);
    EXPECT_NEAR(decibans(std::log(2.5)), 4.0, 0.03);
}

TEST(RoughOdds, AreNoFinerThanTheyAreKnown) {
    EXPECT_EQ(rough_odds(1.0), "about 1 to 1");
    EXPECT_EQ(rough_odds(5.93), "about 6 to 1");
    EXPECT_EQ(rough_odds(9.6), "about 10 to 1");
    EXPECT_EQ(rough_odds(34.0), "about 30 to 1");
    EXPECT_EQ(rough_odds(99.9), "about 100 to 1");
    EXPECT_EQ(rough_odds(560.0), "over 100 to 1");
}

TEST(SupportedStep, GrowsWithTheInterval) {
    EXPECT_EQ(supported_step(0.90, 0.95), 1);
    EXPECT_EQ(supported_step(0.90, 0.96), 5);
    EXPECT_EQ(supported_step(0.60, 0.89), 5);
    EXPECT_EQ(supported_step(0.10, 0.90), 10);
}

TEST(PercentInSteps, NeverSaysNothingOrAll) {
    EXPECT_EQ(percent_in_steps(0.844, 10), "80 %");
    EXPECT_EQ(percent_in_steps(0.844, 5), "85 %");
    EXPECT_EQ(percent_in_steps(0.844, 1), "84 %");
    EXPECT_EQ(percent_in_steps(0.02, 5), "<5 %");
    EXPECT_EQ(percent_in_steps(0.04, 10), "<10 %");
    EXPECT_EQ(percent_in_steps(0.999, 5), ">95 %");
    EXPECT_EQ(percent_in_steps(0.999, 1), ">99 %");
    EXPECT_EQ(percent_in_steps(0.0, 1), "<1 %");
    EXPECT_EQ(percent_in_steps(1.0, 10), ">90 %");
}

}  // namespace
}  // namespace steelyard::cli
