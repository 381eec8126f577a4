// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/ledger.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <cstdio>
#include <limits>
#include <string>
#include <vector>

#include "../reference/make_posterior.hpp"
#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/posterior.hpp"

namespace {

using steelyard::engine::CauseIndex;
using steelyard::engine::dependence_weight;
using steelyard::engine::ledger;
using steelyard::engine::Ledger;
using steelyard::engine::log_posterior_odds;
using steelyard::engine::rounded_to_add_up;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::posterior_problem;
using steelyard::test::PosteriorProblem;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

/// What is printed: the value at `digits` decimals, by the C library's correctly rounded conversion.
std::string printed(double value, int digits) {
    char text[400];
    std::snprintf(text, sizeof text, "%.*f", digits, value);
    const std::string result = text;
    return result.find_first_of("123456789") == std::string::npos && result.front() == '-' ? result.substr(1)
                                                                                           : result;
}

/// A printed decimal as a whole number of its last unit: exact.
long long units(double value, int digits) {
    std::string text = printed(value, digits);
    std::erase(text, '.');
    return std::stoll(text);
}

TEST(Ledger, LinesAddToTheLastDigit) {
    for (std::uint64_t index = 0; index < 1000; ++index) {
        SCOPED_TRACE(index);
        const PosteriorProblem p = posterior_problem(index);
        const Ledger whole = ledger(p.log_prior, p.loglik, p.weight);
        for (Eigen::Index a = 0; a < p.log_prior.size(); ++a) {
            const Ledger::Pair pair = whole.pair(a, 0);
            double sum = pair.prior;
            double size = std::abs(pair.prior);
            for (Eigen::Index finding = 0; finding < pair.lines.size(); ++finding) {
                sum += pair.lines(finding);
                size += std::abs(pair.lines(finding)) + std::abs(whole.contribution(finding, a)) +
                        std::abs(whole.contribution(finding, 0));
            }
            EXPECT_EQ(pair.total, sum);
            // The same number as the posterior's own log odds, but for the rounding of every line and partial
            // sum.
            const double exact =
                log_posterior_odds(p.log_prior, p.loglik, p.weight, CauseIndex{a}, CauseIndex{0});
            EXPECT_TRUE(near_abs(exact, pair.total, 0x1p-53 * 42 * (size + 60.0)));
        }
    }
}

TEST(Ledger, PairsAreAntisymmetricAndChain) {
    for (std::uint64_t index = 0; index < 200; ++index) {
        const PosteriorProblem p = posterior_problem(index * 11 + 3);  // five causes and more
        const Ledger whole = ledger(p.log_prior, p.loglik, p.weight);
        const Ledger::Pair ab = whole.pair(0, 1), ba = whole.pair(1, 0), bc = whole.pair(1, 2),
                           ac = whole.pair(0, 2);
        EXPECT_EQ(ab.total, -ba.total);
        EXPECT_EQ(whole.pair(2, 2).total, 0.0);
        for (Eigen::Index finding = 0; finding < ab.lines.size(); ++finding) {
            EXPECT_TRUE(near_abs(ac.lines(finding), ab.lines(finding) + bc.lines(finding), 1e-12));
        }
    }
}

TEST(Ledger, WithoutFindingsIsThePrior) {
    Eigen::ArrayXd prior(3);
    prior << std::log(5.0), std::log(3.0), std::log(2.0);
    const Ledger whole = ledger(prior, Eigen::ArrayXXd(0, 3), Eigen::ArrayXd(0));
    EXPECT_TRUE(near_rel(std::log(0.5), whole.log_prior(0), 1e-15));
    EXPECT_TRUE((whole.log_prior - whole.log_posterior).abs().maxCoeff() <= 1e-15);
    EXPECT_EQ(whole.pair(0, 2).lines.size(), 0);
    EXPECT_EQ(whole.pair(0, 2).total, whole.pair(0, 2).prior);
}

TEST(Ledger, RefusesACauseThatIsNotThere) {
    const Ledger whole = ledger(Eigen::ArrayXd::Zero(2), Eigen::ArrayXXd(0, 2), Eigen::ArrayXd(0));
    expect_domain_error([&] { static_cast<void>(whole.pair(2, 0)); }, "Ledger::pair", "a", {}, 2,
                        "between 0 and 1");
    expect_domain_error([&] { static_cast<void>(whole.pair(0, -1)); }, "Ledger::pair", "b", {}, -1,
                        "between 0 and 1");
}

TEST(RoundedToAddUp, AddsExactlyToThePrintedTotal) {
    EXPECT_TRUE(rc::check([](const std::vector<std::int32_t>& words, std::uint8_t choice) {
        const int digits = choice % 7;
        std::vector<double> lines;
        double total = 0.0;
        for (const std::int32_t word : words) {
            lines.push_back(static_cast<double>(word) * 1e-5);
            total += lines.back();
        }
        const std::vector<double> rounded = rounded_to_add_up(lines, digits);
        RC_ASSERT(rounded.size() == lines.size());
        long long sum = 0;
        const double unit = std::pow(10.0, -digits);
        for (std::size_t i = 0; i < lines.size(); ++i) {
            sum += units(rounded[i], digits);
            // Within one unit of the last place, and the value prints as itself.
            RC_ASSERT(std::abs(rounded[i] - lines[i]) <= unit * (1 + 1e-6));
            RC_ASSERT(near_rel(std::stod(printed(rounded[i], digits)), rounded[i], 1e-15));
        }
        RC_ASSERT(sum == units(total, digits));
    }));
}

TEST(RoundedToAddUp, RoundsTiesAsPrintedNumbersAre) {
    // 2.675 is a little below the tie in binary, 0.125 and 0.375 are exact ties: to even.
    EXPECT_EQ(rounded_to_add_up({2.675}, 2), std::vector<double>{2.67});
    EXPECT_EQ(rounded_to_add_up({0.125}, 2), std::vector<double>{0.12});
    EXPECT_EQ(rounded_to_add_up({0.375}, 2), std::vector<double>{0.38});
    EXPECT_EQ(rounded_to_add_up({-2.5}, 0), std::vector<double>{-2.0});
    EXPECT_EQ(rounded_to_add_up({0.4, 0.4, 0.4}, 0), (std::vector<double>{0.0, 1.0, 0.0}));
    EXPECT_TRUE(rounded_to_add_up({}, 3).empty());
    EXPECT_TRUE(rc::check([](std::int32_t word) {
        const double tie = static_cast<double>(word) / 8.0;  // exact ties at two decimals among them
        RC_ASSERT(units(rounded_to_add_up({tie}, 2)[0], 2) == units(tie, 2));
        const double near_tie = static_cast<double>(word) / 200.0;
        RC_ASSERT(units(rounded_to_add_up({near_tie}, 2)[0], 2) == units(near_tie, 2));
    }));
}

TEST(RoundedToAddUp, RefusesWhatCannotBeRounded) {
    for (const double bad : {nan, infinity, -infinity}) {
        expect_domain_error(
            [&] {
                static_cast<void>(rounded_to_add_up({1.0, bad}, 1));
            },
            "rounded_to_add_up", "lines", {1, {}}, bad, "finite");
    }
    expect_domain_error([] { static_cast<void>(rounded_to_add_up({1.0}, -1)); }, "rounded_to_add_up",
                        "digits", {}, -1, "between 0 and 15");
    expect_domain_error([] { static_cast<void>(rounded_to_add_up({1.0}, 16)); }, "rounded_to_add_up",
                        "digits", {}, 16, "between 0 and 15");
    expect_domain_error(
        [] {
            static_cast<void>(rounded_to_add_up({1.0, 1e15}, 1));
        },
        "rounded_to_add_up", "running total", {1, {}}, 1e15 + 1, "within 2^52 units of the last decimal");
    EXPECT_EQ(rounded_to_add_up({0x1p52}, 0)[0], 0x1p52);
}

TEST(DependenceWeight, IsOneOverTheDesignEffect) {
    EXPECT_EQ(dependence_weight(1, 0.7), 1.0);
    EXPECT_EQ(dependence_weight(9, 0.0), 1.0);
    EXPECT_EQ(dependence_weight(4, 1.0), 0.25);
    EXPECT_EQ(dependence_weight(3, 0.5), 0.5);
    for (int m = 1; m < 50; ++m) {
        EXPECT_GE(dependence_weight(m, 0.3), dependence_weight(m + 1, 0.3));
        EXPECT_LE(m * dependence_weight(m, 0.3), (m + 1) * dependence_weight(m + 1, 0.3));
    }
    expect_domain_error([] { static_cast<void>(dependence_weight(0, 0.5)); }, "dependence_weight", "m", {}, 0,
                        "between 1 and 2147483647");
    for (const double bad : {-0.1, 1.1, nan}) {
        expect_domain_error([&] { static_cast<void>(dependence_weight(2, bad)); }, "dependence_weight", "rho",
                            {}, bad, "between 0 and 1");
    }
}

}  // namespace
