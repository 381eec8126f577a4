// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/soft_evidence.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>
#include <optional>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/posterior.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::ReferenceTable;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

/// The inputs list a row per cause; a table has a column per cause.
Eigen::ArrayXXd table_of(const nlohmann::json& rows) {
    return steelyard::test::matrix(rows).transpose();
}

std::string at(const std::string& quantity, Eigen::Index i) {
    return quantity + "[" + std::to_string(i) + "]";
}

TEST(SoftEvidence, AgreesWithTheReferenceTable) {
    const ReferenceTable reference("soft_evidence.csv");
    const auto inputs = steelyard::test::reference_json("soft_evidence_inputs.json");
    for (const auto& one : inputs.at("soft_cases")) {
        const std::string name = one.at("id");
        const Eigen::ArrayXd prior = steelyard::test::numbers(one.at("prior_odds"));
        const Eigen::ArrayXXd table = table_of(one.at("table"));
        const Eigen::ArrayXd lambda = steelyard::test::numbers(one.at("weights"));
        const Eigen::ArrayXd q = lambda / lambda.sum();
        const Eigen::ArrayXd pearl = virtual_evidence(prior, table, lambda);
        const Eigen::ArrayXd jeffrey = jeffrey_update(prior, table, q);
        const Eigen::ArrayXd bridge = equivalent_virtual_evidence(prior, table, q);
        const Eigen::ArrayXd marginal = band_marginal(prior, table);
        for (Eigen::Index k = 0; k < prior.size(); ++k) {
            const std::string tag =
                "[" + one.at("causes").at(static_cast<std::size_t>(k)).get<std::string>() + "]";
            EXPECT_TRUE(reference.matches(name, "pearl_virtual_evidence" + tag, pearl(k)));
            EXPECT_TRUE(reference.matches(name, "jeffrey" + tag, jeffrey(k)));
        }
        for (Eigen::Index b = 0; b < lambda.size(); ++b) {
            EXPECT_TRUE(reference.matches(name, at("lambda_equivalent_to_jeffrey", b), bridge(b)));
            EXPECT_TRUE(reference.matches(name, at("marginal", b), marginal(b)));
        }
    }
    for (const auto& one : inputs.at("two_soft_findings")) {
        const std::string name = one.at("id");
        const Eigen::ArrayXd prior = steelyard::test::numbers(one.at("prior_odds"));
        const Eigen::ArrayXXd first = table_of(one.at("table1"));
        const Eigen::ArrayXXd second = table_of(one.at("table2"));
        const Eigen::ArrayXd q1 = steelyard::test::numbers(one.at("weights1"));
        const Eigen::ArrayXd q2 = steelyard::test::numbers(one.at("weights2"));
        const Eigen::ArrayXd jeffrey12 = jeffrey_update(jeffrey_update(prior, first, q1), second, q2);
        const Eigen::ArrayXd jeffrey21 = jeffrey_update(jeffrey_update(prior, second, q2), first, q1);
        const Eigen::ArrayXd pearl12 = virtual_evidence(virtual_evidence(prior, first, q1), second, q2);
        const Eigen::ArrayXd pearl21 = virtual_evidence(virtual_evidence(prior, second, q2), first, q1);
        for (Eigen::Index k = 0; k < prior.size(); ++k) {
            EXPECT_TRUE(reference.matches(name, at("jeffrey_1then2", k), jeffrey12(k)));
            EXPECT_TRUE(reference.matches(name, at("jeffrey_2then1", k), jeffrey21(k)));
            EXPECT_TRUE(reference.matches(name, at("pearl_1then2", k), pearl12(k)));
            EXPECT_TRUE(reference.matches(name, at("pearl_2then1", k), pearl21(k)));
        }
    }
    for (const auto& one : inputs.at("measurement_error")) {
        const std::string name = one.at("id");
        const Eigen::ArrayXd edges = steelyard::test::numbers(one.at("cuts"));
        const double value = one.at("value");
        const double sd = one.at("sd");
        const Eigen::ArrayXd prior = steelyard::test::numbers(one.at("prior_odds"));
        const Eigen::ArrayXXd table = table_of(one.at("table"));
        const Eigen::ArrayXd mass = band_mass(value, sd, edges);
        const Eigen::Index hard = hard_band(value, edges);
        EXPECT_TRUE(reference.matches(name, "hard_category", static_cast<double>(hard)));
        Eigen::ArrayXd certain = Eigen::ArrayXd::Zero(mass.size());
        certain(hard) = 1.0;
        const Eigen::ArrayXd by_band = virtual_evidence(prior, table, certain);
        const Eigen::ArrayXd by_mass = virtual_evidence(prior, table, mass);
        const Eigen::ArrayXd by_jeffrey = jeffrey_update(prior, table, mass);
        for (Eigen::Index b = 0; b < mass.size(); ++b) {
            EXPECT_TRUE(reference.matches(name, at("mass", b), mass(b)));
        }
        for (Eigen::Index k = 0; k < prior.size(); ++k) {
            EXPECT_TRUE(reference.matches(name, at("posterior_hard", k), by_band(k)));
            EXPECT_TRUE(reference.matches(name, at("posterior_mass_as_virtual_evidence", k), by_mass(k)));
            EXPECT_TRUE(reference.matches(name, at("posterior_mass_as_jeffrey", k), by_jeffrey(k)));
        }
        if (one.contains("width")) {
            const double width = one.at("width");
            const Eigen::ArrayXd lambda =
                band_density(value, sd, edges, edges(0) - width, edges(edges.size() - 1) + width);
            const Eigen::ArrayXd by_density = virtual_evidence(prior, table, lambda);
            for (Eigen::Index b = 0; b < lambda.size(); ++b) {
                EXPECT_TRUE(reference.matches(name, at("lambda_uniform_within", b), lambda(b)));
            }
            for (Eigen::Index k = 0; k < prior.size(); ++k) {
                EXPECT_TRUE(reference.matches(name, at("posterior_lambda_uniform_within", k), by_density(k)));
            }
        }
    }
    EXPECT_EQ(reference.unused(), std::vector<std::string>{});
}

TEST(SoftEvidence, HasTwoReadingsThatDifferFourfold) {
    // Jacobs, JAIR 2019;65:783 (inputs as given there): prior 1 %, sensitivity 90 %, false positives 5 %, "80
    // % sure it is positive". By hand: virtual 0.01 (0.8 * 0.9 + 0.2 * 0.1) / (0.0074 + 0.99 (0.8 * 0.05 +
    // 0.2 * 0.95)) = 0.0074/0.2351.
    const Eigen::ArrayXd prior = array({0.01, 0.99});
    const Eigen::ArrayXXd table = (Eigen::ArrayXXd(2, 2) << 0.9, 0.05, 0.1, 0.95).finished();
    EXPECT_TRUE(near_rel(0.0074 / 0.2351, virtual_evidence(prior, table, array({0.8, 0.2}))(0), 1e-13));
    EXPECT_TRUE(near_abs(0.12329, jeffrey_update(prior, table, array({0.8, 0.2}))(0), 1e-5));
}

/// A random prior over three causes with two random tables of four bands.
struct Case {
    Eigen::ArrayXd prior;
    Eigen::ArrayXXd first, second;
    Eigen::ArrayXd lambda, mu;
};

Case random_case() {
    const auto list = *rc::gen::container<std::vector<int>>(35, rc::gen::inRange(1, 1000));
    const Eigen::ArrayXd all = Eigen::Map<const Eigen::ArrayXi>(list.data(), 35).cast<double>();
    Case one{all.head(3), Eigen::ArrayXXd(4, 3), Eigen::ArrayXXd(4, 3), all.segment(27, 4), all.tail(4)};
    for (Eigen::Index k = 0; k < 3; ++k) {
        one.first.col(k) = all.segment(3 + 4 * k, 4) / all.segment(3 + 4 * k, 4).sum();
        one.second.col(k) = all.segment(15 + 4 * k, 4) / all.segment(15 + 4 * k, 4).sum();
    }
    return one;
}

bool same(const Eigen::ArrayXd& a, const Eigen::ArrayXd& b) {
    return (a - b).abs().maxCoeff() < 1e-13;
}

TEST(VirtualEvidence, CommutesAndKnowsNoScale) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::ArrayXd there =
            virtual_evidence(virtual_evidence(c.prior, c.first, c.lambda), c.second, c.mu);
        const Eigen::ArrayXd back =
            virtual_evidence(virtual_evidence(c.prior, c.second, c.mu), c.first, c.lambda);
        RC_ASSERT(same(there, back));
        RC_ASSERT(same(virtual_evidence(c.prior, c.first, c.lambda),
                       virtual_evidence(c.prior, c.first, c.lambda * 1e-200)));
        RC_ASSERT(same(virtual_evidence(c.prior, c.first, c.lambda),
                       virtual_evidence(c.prior * 1e300, c.first, c.lambda)));
    }));
}

TEST(VirtualEvidence, ChangesNothingWhenAllBandsAreEquallyLikely) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::ArrayXd after = virtual_evidence(c.prior, c.first, Eigen::ArrayXd::Constant(4, 0.3));
        RC_ASSERT(same(c.prior / c.prior.sum(), after));
    }));
}

TEST(VirtualEvidence, IsOneLineOfEvidenceForThePosterior) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::ArrayXXd line = virtual_loglik(c.first, c.lambda).transpose();
        RC_ASSERT(same(virtual_evidence(c.prior, c.first, c.lambda),
                       posterior(c.prior.log(), line, Eigen::ArrayXd::Ones(1))));
    }));
}

TEST(JeffreyUpdate, WithTheCurrentMarginalChangesNothing) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        RC_ASSERT(
            same(c.prior / c.prior.sum(), jeffrey_update(c.prior, c.first, band_marginal(c.prior, c.first))));
    }));
}

TEST(JeffreyUpdate, IsTheVirtualEvidenceOfTheBridge) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::ArrayXd q = c.lambda / c.lambda.sum();
        const Eigen::ArrayXd updated = jeffrey_update(c.prior, c.first, q);
        RC_ASSERT(same(updated,
                       virtual_evidence(c.prior, c.first, equivalent_virtual_evidence(c.prior, c.first, q))));
    }));
}

TEST(JeffreyUpdate, OfACertainBandIsConditioning) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::Index band = *rc::gen::inRange(0, 4);
        Eigen::ArrayXd certain = Eigen::ArrayXd::Zero(4);
        certain(band) = 1.0;
        const Eigen::ArrayXd weight = c.prior * c.first.row(band).transpose();
        RC_ASSERT(same(weight / weight.sum(), jeffrey_update(c.prior, c.first, certain)));
        RC_ASSERT(same(weight / weight.sum(), virtual_evidence(c.prior, c.first, certain)));
    }));
}

TEST(BandMass, AddsToOneAndKeepsItsTails) {
    EXPECT_TRUE(rc::check([] {
        const double reading = *rc::gen::inRange(-400, 400) / 10.0;
        const double sd = *rc::gen::inRange(1, 100) / 10.0;
        const Eigen::ArrayXd edges = array({-10.0, -1.0, 0.0, 5.0, 12.0});
        const Eigen::ArrayXd mass = band_mass(reading, sd, edges);
        RC_ASSERT(near_abs(1.0, mass.sum(), 1e-15 * 8));
        RC_ASSERT(mass.minCoeff() >= 0.0);
        // Turned over, the bands come in the other order.
        RC_ASSERT(same(mass.reverse(), band_mass(-reading, sd, -edges.reverse())));
    }));
    // Abramowitz and Stegun table 26.2: -log10 Q(20) = 88.56010.
    EXPECT_TRUE(near_abs(-88.56010, std::log10(band_mass(-20.0, 1.0, array({0.0}))(1)), 5e-6));
}

TEST(HardBand, GivesAnEdgeToTheBandAbove) {
    const Eigen::ArrayXd edges = array({3.0, 3.5});
    EXPECT_EQ(hard_band(std::nextafter(3.0, 0.0), edges), 0);
    EXPECT_EQ(hard_band(3.0, edges), 1);
    EXPECT_EQ(hard_band(3.5, edges), 2);
    // Under error the same reading is split in two halves.
    EXPECT_TRUE(near_abs(0.5, band_mass(3.0, 0.01, edges)(0), 1e-15));
}

TEST(BandDensity, DoesNotFavourWideBands) {
    // Far from any error the density is even: equal lambdas, which say nothing, though the masses are 1 to 9.
    const Eigen::ArrayXd edges = array({1.0});
    const Eigen::ArrayXd density = band_density(5.0, 1e6, edges, 0.0, 10.0);
    EXPECT_TRUE(near_rel(density(0), density(1), 1e-9));
    EXPECT_GT(band_mass(5.0, 1e-3, edges)(1), 0.999);
}

TEST(SoftEvidence, RefusesWhatCannotBe) {
    const std::optional<Eigen::Index> none;
    const Eigen::ArrayXXd table = (Eigen::ArrayXXd(2, 2) << 1.0, 1.0, 0.0, 0.0).finished();
    const Eigen::ArrayXd even = array({1.0, 1.0});
    expect_domain_error(
        [&] {
            (void)virtual_evidence(even, table, array({0.0, 1.0}));
        },
        "virtual_evidence", "lambda", {}, 0, "possible under some cause of the prior");
    expect_domain_error(
        [&] {
            (void)virtual_evidence(even, table, array({0.0, 0.0}));
        },
        "virtual_evidence", "largest lambda", {}, 0, "finite and > 0");
    expect_domain_error(
        [&] {
            (void)virtual_evidence(array({1.0, nan}), table, even);
        },
        "virtual_evidence", "prior", {1, none}, nan, "finite and >= 0");
    expect_domain_error(
        [&] {
            (void)jeffrey_update(even, table, array({0.5, 0.5}));
        },
        "jeffrey_update", "q", {1, none}, 0.5, "0 where the prior holds the band impossible");
    expect_domain_error(
        [&] {
            (void)jeffrey_update(even, table, array({0.5, 0.6}));
        },
        "jeffrey_update", "q sum", {}, 1.1, "1 within 1e-09");
    expect_domain_error([&] { (void)band_marginal(even, table * 0.5); }, "band_marginal", "table column sum",
                        {none, 0}, 0.5, "1 within 1e-9");
    expect_domain_error([] { (void)band_mass(1.0, 0.0, array({0.0})); }, "band_mass", "sd", {}, 0,
                        "finite and > 0");
    expect_domain_error(
        [] {
            (void)band_mass(1.0, 1.0, array({0.0, 0.0}));
        },
        "band_mass", "edges", {1, none}, 0, "above the edge before it");
    expect_domain_error([] { (void)hard_band(nan, array({0.0})); }, "hard_band", "value", {}, nan, "finite");
    expect_domain_error([] { (void)band_density(5.0, 1.0, array({0.0}), 1.0, 9.0); }, "band_density",
                        "lowest", {}, 1, "finite and below the first edge");
    expect_domain_error([] { (void)band_density(1e9, 1.0, array({0.0}), -1.0, 9.0); }, "band_density",
                        "reading", {}, 1e9, "within reach of some band, given its error");
}

}  // namespace
