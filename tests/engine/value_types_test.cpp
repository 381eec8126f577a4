// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/log_weight.hpp"
#include "steelyard/engine/probability.hpp"

namespace {

using steelyard::engine::LogOdds;
using steelyard::engine::LogWeight;
using steelyard::engine::Probability;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

/// Uniform in (0, 1) from RapidCheck's words.
double unit(std::uint32_t word) {
    return (static_cast<double>(word) + 0.5) * 0x1p-32;
}

TEST(Probability, GoesToLogOddsAndBack) {
    EXPECT_TRUE(rc::check([](std::uint32_t word) {
        const double p = unit(word);
        // d p = p (1 - p) d x: a relative error e of x costs |x| p (1 - p) e <= 0.23 e; a few roundings in
        // all.
        RC_ASSERT(near_rel(p, LogOdds::of(Probability::of(p)).to_probability().value(),
                           2e-15 + 4e-16 * std::log(1 / p)));
    }));
}

TEST(LogOdds, GoToProbabilityAndBack) {
    EXPECT_TRUE(rc::check([](std::uint32_t word) {
        const double x = (unit(word) - 0.5) * 2.0 * 700.0;
        const double back = LogOdds::of(LogOdds::nats(x).to_probability()).to_nats();
        // Towards 1 the rounding of p itself is 2^-53 e^x of the odds.
        const double lost = x > 0 ? 0x1p-53 * std::exp(std::fmin(x, 700.0)) : 0.0;
        if (x < 30.0) {
            RC_ASSERT(near_abs(x, back, 4e-16 * std::abs(x) + 4e-16 + 2 * lost));
        } else {
            RC_ASSERT(back >= 30.0 - 1e-2);
        }
    }));
}

TEST(LogOdds, KeepSmallDifferencesFromEven) {
    // ln((1/2 + d) / (1/2 - d)) = 4 d + 16 d^3 / 3 + ...: at d = 2^-40 the first term is the value to 24
    // digits.
    EXPECT_EQ(LogOdds::of(Probability::of(0.5 + 0x1p-40)).to_nats(), 0x1p-38);
    EXPECT_EQ(LogOdds::of(Probability::of(0.5)).to_nats(), 0.0);
}

TEST(LogOdds, HoldBothCertainties) {
    EXPECT_EQ(LogOdds::of(Probability::of(0.0)).to_nats(), -infinity);
    EXPECT_EQ(LogOdds::of(Probability::of(1.0)).to_nats(), infinity);
    EXPECT_EQ(LogOdds::nats(-infinity).to_probability().value(), 0.0);
    EXPECT_EQ(LogOdds::nats(infinity).to_probability().value(), 1.0);
    EXPECT_EQ(LogOdds::of_odds(0.0).to_probability().value(), 0.0);
    EXPECT_EQ(LogOdds::nats(infinity).to_odds(), infinity);
    EXPECT_EQ((LogOdds::nats(infinity) + LogWeight::nats(-1e300)).to_nats(), infinity);
}

TEST(LogOdds, OfTheOppositeChangeSignExactly) {
    const LogOdds far = LogOdds::nats(-740.0);
    EXPECT_EQ(far.complement().to_nats(), 740.0);
    EXPECT_EQ(far.complement().complement(), far);
    EXPECT_EQ(Probability::of(0.25).complement(), Probability::of(0.75));
    EXPECT_EQ(LogOdds::of_odds(3.0).complement().to_nats(), LogOdds::nats(-std::log(3.0)).to_nats());
}

TEST(LogOdds, WrittenAsOddsAreOdds) {
    EXPECT_TRUE(near_rel(0.25, LogOdds::of_odds(1.0 / 3.0).to_probability().value(), 1e-15));
    EXPECT_TRUE(near_rel(8.0 / 5.0, LogOdds::of(Probability::of(8.0 / 13.0)).to_odds(), 1e-15));
}

TEST(LogWeight, SaysTheSameInEveryUnit) {
    EXPECT_TRUE(rc::check([](std::uint32_t word) {
        const double x = (unit(word) - 0.5) * 2e4;
        RC_ASSERT(near_rel(x, LogWeight::bits(x).to_bits(), 4e-16));
        RC_ASSERT(near_rel(x, LogWeight::bans(x).to_bans(), 4e-16));
        RC_ASSERT(near_rel(x, LogWeight::decibans(x).to_decibans(), 4e-16));
        RC_ASSERT(LogWeight::nats(x).to_nats() == x);
        RC_ASSERT(near_rel(10.0 * LogWeight::nats(x).to_bans(), LogWeight::nats(x).to_decibans(), 4e-16));
    }));
}

TEST(LogWeight, AddsMovesOddsAndIsTheirDifference) {
    const LogWeight three = LogWeight::of_ratio(3.0);
    const LogWeight two = LogWeight::of_ratio(2.0);
    EXPECT_TRUE(near_rel(6.0, (three + two).to_ratio(), 1e-15));
    EXPECT_TRUE(near_rel(1.5, (three - two).to_ratio(), 1e-15));
    EXPECT_EQ((-three).to_nats(), -three.to_nats());
    EXPECT_EQ((LogOdds::nats(1.0) + LogWeight::nats(2.0)).to_nats(), 3.0);
    EXPECT_EQ((LogOdds::nats(1.0) - LogWeight::nats(2.0)).to_nats(), -1.0);
    EXPECT_EQ((LogOdds::nats(1.0) - LogOdds::nats(3.0)).to_nats(), -2.0);
    EXPECT_EQ(LogWeight::nats(3.0).discounted(0.5).to_nats(), 1.5);
    EXPECT_LT(two, three);
}

TEST(Probability, RefusesWhatIsNoProbability) {
    for (const double bad : {-1e-300, 1.0 + 0x1p-52, nan, infinity, -infinity}) {
        expect_domain_error([&] { static_cast<void>(Probability::of(bad)); }, "Probability::of", "value", {},
                            bad, "between 0 and 1");
    }
    EXPECT_EQ(Probability::of(1.0).value(), 1.0);
    EXPECT_EQ(Probability::of(5e-324).value(), 5e-324);
}

TEST(LogOdds, RefuseNaNAndNegativeOdds) {
    expect_domain_error([] { static_cast<void>(LogOdds::nats(nan)); }, "LogOdds::nats", "value", {}, nan,
                        "a number or an infinity");
    for (const double bad : {-1.0, nan, infinity}) {
        expect_domain_error([&] { static_cast<void>(LogOdds::of_odds(bad)); }, "LogOdds::of_odds", "odds", {},
                            bad, "finite and >= 0");
    }
}

TEST(LogWeight, RefusesWhatIsNotFinite) {
    for (const double bad : {nan, infinity, -infinity}) {
        expect_domain_error([&] { static_cast<void>(LogWeight::nats(bad)); }, "LogWeight::nats", "value", {},
                            bad, "finite");
        expect_domain_error([&] { static_cast<void>(LogWeight::bits(bad)); }, "LogWeight::bits", "value", {},
                            bad, "finite");
        expect_domain_error([&] { static_cast<void>(LogWeight::bans(bad)); }, "LogWeight::bans", "value", {},
                            bad, "finite");
        expect_domain_error([&] { static_cast<void>(LogWeight::decibans(bad)); }, "LogWeight::decibans",
                            "value", {}, bad, "finite");
    }
    expect_domain_error([] { static_cast<void>(LogWeight::bans(1.5e308)); }, "LogWeight::bans",
                        "value in nats", {}, infinity, "finite");
    for (const double bad : {0.0, -2.0, nan, infinity}) {
        expect_domain_error([&] { static_cast<void>(LogWeight::of_ratio(bad)); }, "LogWeight::of_ratio",
                            "ratio", {}, bad, "finite and > 0");
    }
    for (const double bad : {-0.1, 1.1, nan}) {
        expect_domain_error([&] { static_cast<void>(LogWeight::nats(1).discounted(bad)); },
                            "LogWeight::discounted", "factor", {}, bad, "between 0 and 1");
    }
    expect_domain_error([] { static_cast<void>(LogWeight::nats(1.7e308) + LogWeight::nats(1.7e308)); },
                        "LogWeight::nats", "value", {}, infinity, "finite");
    expect_domain_error([] { static_cast<void>(LogOdds::nats(infinity) - LogOdds::nats(infinity)); },
                        "LogWeight::nats", "value", {}, nan, "finite");
}

}  // namespace
