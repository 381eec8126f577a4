// SPDX-License-Identifier: Apache-2.0
// The correlation of a group of findings, fitted: copies of one finding, independent findings, several
// groups.
#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "audit_samples.hpp"
#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/group_correlation.hpp"

namespace steelyard::test {
namespace {

using engine::GroupCorrelation;
using engine::GroupedEvidence;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Final causes exactly as frequent as a weight of 1 / (1 + (m - 1) rho) for each group says.
GroupedEvidence made(const Eigen::Index patterns, const std::vector<double>& rho, std::uint64_t seed) {
    const Eigen::Index causes = 3;
    GroupedEvidence evidence;
    evidence.log_prior = Eigen::ArrayXd::LinSpaced(causes, -1.0, 0.0);
    const auto loglik = [&](std::uint32_t stream) {
        Eigen::ArrayXXd values(patterns, causes);
        for (Eigen::Index i = 0; i < values.size(); ++i) {
            values(i) = -2.0 * engine::uniform(seed, stream, static_cast<std::uint64_t>(i));
        }
        return values;
    };
    evidence.ungrouped = loglik(1);
    Eigen::ArrayXXd score = evidence.ungrouped;
    score.rowwise() += evidence.log_prior.transpose();
    for (std::size_t h = 0; h < rho.size(); ++h) {
        engine::GroupEvidence group;
        group.loglik = loglik(2 + static_cast<std::uint32_t>(h));
        group.observed.resize(patterns);
        for (Eigen::Index g = 0; g < patterns; ++g) {
            group.observed(g) = static_cast<double>((g + static_cast<Eigen::Index>(h)) % 4);
            if (group.observed(g) == 0.0) {
                group.loglik.row(g).setZero();
            }
            score.row(g) += group.loglik.row(g) / (1.0 + std::max(0.0, group.observed(g) - 1.0) * rho[h]);
        }
        evidence.groups.push_back(group);
    }
    evidence.count = 100.0 * normalised(score).exp();
    return evidence;
}

double loglik_at(const GroupedEvidence& evidence, const std::vector<double>& rho) {
    Eigen::ArrayXXd score = evidence.ungrouped;
    score.rowwise() += evidence.log_prior.transpose();
    for (std::size_t h = 0; h < rho.size(); ++h) {
        const Eigen::ArrayXd weight = 1.0 / (1.0 + (evidence.groups[h].observed - 1.0).max(0.0) * rho[h]);
        score += evidence.groups[h].loglik.colwise() * weight;
    }
    return (evidence.count * normalised(score)).sum();
}

TEST(GroupCorrelation, FindsTheRhoThatMadeTheFinalCauses) {
    for (const double rho : {0.15, 0.5, 0.9}) {
        const GroupedEvidence evidence = made(60, {rho}, 1);
        const engine::GroupCorrelations got = fit_group_correlations(evidence);
        const GroupCorrelation& group = got.group.at(0).value();
        EXPECT_NEAR(group.rho, rho, 1e-7);
        EXPECT_TRUE(near_rel(loglik_at(evidence, {rho}), got.loglik, 1e-13));
        EXPECT_TRUE(near_rel(loglik_at(evidence, {0.0}), got.loglik_independent, 1e-13));
        EXPECT_FALSE(group.at_lower_border || group.at_upper_border);
        if (!group.low_open) {
            EXPECT_NEAR(loglik_at(evidence, {group.low}), got.loglik - 1.92072941, 1e-7);
        }
        if (!group.high_open) {
            EXPECT_NEAR(loglik_at(evidence, {group.high}), got.loglik - 1.92072941, 1e-7);
        }
        EXPECT_FALSE(rho == 0.5 && (group.low_open || group.high_open));
    }
}

TEST(GroupCorrelation, FitsSeveralGroupsTogether) {
    const GroupedEvidence evidence = made(80, {0.3, 0.7}, 2);
    const engine::GroupCorrelations got = fit_group_correlations(evidence);
    const GroupCorrelation& one = got.group.at(0).value();
    EXPECT_NEAR(one.rho, 0.3, 1e-7);
    EXPECT_NEAR(got.group.at(1)->rho, 0.7, 1e-7);
    // The profile: the best of the other group at the end of the interval, by a fine search.
    ASSERT_FALSE(one.high_open);
    double best = -1e300;
    for (int i = 0; i <= 10000; ++i) {
        best = std::max(best, loglik_at(evidence, {one.high, i / 10000.0}));
    }
    EXPECT_NEAR(best, got.loglik - 1.92072941, 1e-5);
}

TEST(GroupCorrelation, OfOneFindingEnteredTwiceIsOne) {
    GroupedEvidence evidence = made(50, {1.0}, 3);
    for (Eigen::Index g = 0; g < 50; ++g) {
        evidence.groups[0].observed(g) = 2.0;
        evidence.groups[0].loglik.row(g) = 2.0 * evidence.ungrouped.row((g + 1) % 50);
    }
    Eigen::ArrayXXd score = evidence.ungrouped + 0.5 * evidence.groups[0].loglik;
    score.rowwise() += evidence.log_prior.transpose();
    evidence.count = 100.0 * normalised(score).exp();
    const GroupCorrelation got = fit_group_correlations(evidence).group.at(0).value();
    EXPECT_NEAR(got.rho, 1.0, 1e-6);
    EXPECT_TRUE(got.high_open);
    EXPECT_EQ(got.high, 1.0);
}

TEST(GroupCorrelation, SaysWhenItEndsAtABorder) {
    GroupedEvidence evidence = made(50, {0.0}, 4);
    Eigen::ArrayXXd score = evidence.ungrouped + 2.0 * evidence.groups[0].loglik;  // more than independent
    score.rowwise() += evidence.log_prior.transpose();
    evidence.count = 100.0 * normalised(score).exp();
    GroupCorrelation got = fit_group_correlations(evidence).group.at(0).value();
    EXPECT_EQ(got.rho, 0.0);
    EXPECT_TRUE(got.at_lower_border && got.low_open);
    score = evidence.ungrouped;  // the group says nothing of the final cause
    score.rowwise() += evidence.log_prior.transpose();
    evidence.count = 100.0 * normalised(score).exp();
    got = fit_group_correlations(evidence).group.at(0).value();
    EXPECT_EQ(got.rho, 1.0);
    EXPECT_TRUE(got.at_upper_border && got.high_open);
}

TEST(GroupCorrelation, OfAGroupNeverSeenTwiceIsNotEstimable) {
    GroupedEvidence evidence = made(40, {0.4, 0.4}, 5);
    evidence.groups[1].observed = evidence.groups[1].observed.min(1.0);
    engine::GroupCorrelations got = fit_group_correlations(evidence);
    EXPECT_TRUE(got.group[0].has_value());
    EXPECT_FALSE(got.group[1].has_value());
    for (Eigen::Index g = 0; g < 40; ++g) {  // nobody is in the rows that have two
        if (evidence.groups[0].observed(g) >= 2.0) {
            evidence.count.row(g).setZero();
        }
    }
    got = fit_group_correlations(evidence);
    EXPECT_FALSE(got.group[0].has_value());
    EXPECT_EQ(got.loglik, got.loglik_independent);
}

TEST(GroupCorrelation, RefusesBadArguments) {
    const GroupedEvidence good = made(8, {0.4}, 6);
    const auto refused = [&](const auto& spoil, const std::string& argument, Place place, double value,
                             const std::string& requirement) {
        GroupedEvidence bad = good;
        spoil(bad);
        expect_domain_error([&] { static_cast<void>(fit_group_correlations(bad)); }, "fit_group_correlations",
                            argument, place, value, requirement);
    };
    refused([](GroupedEvidence& e) { e.log_prior(1) = nan; }, "log_prior", {1, {}}, nan, "finite");
    refused([](GroupedEvidence& e) { e.log_prior.resize(2); }, "log_prior size", {}, 2, "3");
    refused([](GroupedEvidence& e) { e.ungrouped(2, 1) = 0.5; }, "ungrouped", {2, 1}, 0.5, "finite and <= 0");
    refused([](GroupedEvidence& e) { e.groups.clear(); }, "groups size", {}, 0, "at least 1");
    refused([](GroupedEvidence& e) { e.groups[0].loglik(3, 0) = nan; }, "groups loglik", {3, 0}, nan,
            "finite and <= 0");
    refused([](GroupedEvidence& e) { e.groups[0].observed(1) = 1.5; }, "groups observed", {1, {}}, 1.5,
            "whole, >= 0 and at most 1e6");
    refused([](GroupedEvidence& e) { e.groups[0].loglik.row(0).setConstant(-1.0); }, "groups loglik", {0, {}},
            -1, "0 where none was observed");
    refused([](GroupedEvidence& e) { e.count(1, 1) = -1.0; }, "count", {1, 1}, -1, "finite and >= 0");
    refused([](GroupedEvidence& e) { e.count.setZero(); }, "count sum", {}, 0, "finite and > 0");
    refused([](GroupedEvidence& e) { e.count.resize(0, 3); }, "count rows size", {}, 0, "at least 1");
}

}  // namespace
}  // namespace steelyard::test
