// SPDX-License-Identifier: Apache-2.0
// Information and fit against tests/reference/information.csv: three small examples worked in rational
// arithmetic and in decimals of 60 digits.

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>
#include <string>
#include <vector>

#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/fit.hpp"
#include "steelyard/engine/information.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::ReferenceTable;

/// One example: names and tables of its findings in order, and what was seen of those observed.
struct Example {
    explicit Example(const nlohmann::json& input)
        : id(input.at("id")), now(steelyard::test::numbers(input.at("prior_odds"))) {
        now /= now.sum();
        for (const auto& cause : input.at("causes")) {
            causes.push_back(cause);
        }
        for (const auto& [finding, rows] : input.at("tables").items()) {
            names.push_back(finding);
            tables.emplace_back(
                steelyard::test::matrix(rows).transpose());  // the inputs list a row per cause
            if (input.at("observed").contains(finding)) {
                observed_names.push_back(finding);
                observed_tables.push_back(tables.back());
                seen.push_back(BandIndex{input.at("observed").at(finding).get<Eigen::Index>()});
            }
        }
    }
    std::string name(FindingIndex finding) const { return names.at(static_cast<std::size_t>(finding.value)); }

    std::string id;
    Eigen::ArrayXd now;
    std::vector<std::string> causes, names, observed_names;
    std::vector<Eigen::ArrayXXd> tables, observed_tables;
    std::vector<BandIndex> seen;
};

class InformationReference : public testing::Test {
  protected:
    void number(const Example& example, const std::string& quantity, double got) const {
        EXPECT_TRUE(table_.matches(example.id, quantity, got));
        const double want = table_.value(example.id, quantity);
        if (std::isinf(want)) {  // no tolerance relative to it says anything
            EXPECT_EQ(got, want) << example.id << " " << quantity;
        }
    }
    void label(const Example& example, const std::string& quantity, const std::string& got) const {
        const auto& row = table_.rows().at({example.id, quantity});
        row.used = true;
        EXPECT_EQ(row.value, got) << example.id << " " << quantity;
    }
    void one_finding(const Example& example) const;
    void two_findings(const Example& example) const;
    void fit(const Example& example) const;

    const ReferenceTable table_ = ReferenceTable("information.csv");
};

void InformationReference::one_finding(const Example& example) const {
    const double bits = entropy_bits(example.now);
    number(example, "entropy_bits", bits);
    number(example, "entropy_nats", bits * std::numbers::ln2);
    number(example, "effective_number_of_causes_exp_entropy", std::exp2(bits));
    Eigen::ArrayXd gains(static_cast<Eigen::Index>(example.tables.size()));
    for (std::size_t f = 0; f < example.tables.size(); ++f) {
        const ExpectedInformation information = expected_information(example.now, example.tables[f]);
        gains(static_cast<Eigen::Index>(f)) = information.bits;
        number(example, "mutual_information_bits[" + example.names[f] + "]", information.bits);
        double expected_leader = 0.0;
        for (Eigen::Index band = 0; band < information.after.cols(); ++band) {
            const std::string tag = "[" + example.names[f] + "=" + std::to_string(band) + "]";
            expected_leader += information.band_probability(band) * information.after.col(band).maxCoeff();
            number(example, "outcome_prob" + tag, information.band_probability(band));
            number(example, "entropy_after_bits" + tag, entropy_bits(information.after.col(band)));
        }
        number(example, "expected_max_posterior[" + example.names[f] + "]", expected_leader);
    }
    label(example, "myopic_best", example.name(first_best(gains)));
}

void InformationReference::two_findings(const Example& example) const {
    for (std::size_t f = 0; f < example.tables.size(); ++f) {
        const double first = expected_information(example.now, example.tables[f]).bits;
        for (std::size_t g = f + 1; g < example.tables.size(); ++g) {
            const std::string tag = "[" + example.names[f] + "+" + example.names[g] + "]";
            const double both = pair_information(example.now, example.tables[f], example.tables[g]);
            const double second = expected_information(example.now, example.tables[g]).bits;
            number(example, "bundle_information_bits" + tag, both);
            number(example, "redundancy_bits" + tag, first + second - both);
        }
        const TwoStepPlan plan =
            two_step_plan(example.now, example.tables, FindingIndex{static_cast<Eigen::Index>(f)});
        std::string seconds;
        for (std::size_t band = 0; band < plan.second.size(); ++band) {
            seconds += (band == 0 ? "" : " ") + std::to_string(band) + "->" +
                       example.name(plan.second[band].value());
        }
        const std::string tag = "[first=" + example.names[f] + "]";
        number(example, "adaptive_two_step_bits" + tag, plan.bits);
        label(example, "adaptive_plan" + tag, seconds);
    }
    const FindingPair best = best_pair(example.now, example.tables);
    label(example, "best_bundle_of_two", example.name(best.first) + "+" + example.name(best.second));
}

void InformationReference::fit(const Example& example) const {
    Eigen::ArrayXXd loglik(static_cast<Eigen::Index>(example.seen.size()), example.now.size());
    for (std::size_t f = 0; f < example.seen.size(); ++f) {
        loglik.row(static_cast<Eigen::Index>(f)) =
            example.observed_tables[f].row(example.seen[f].value).log();
        const PredictiveCheck alone =
            predictive_check(example.now, {example.observed_tables[f]}, {example.seen[f]});
        const std::string tag = "[" + example.observed_names[f] + "]";
        number(example, "marginal_prob_of_observed" + tag, alone.probability);
        number(example, "prior_predictive_p" + tag, alone.p_value.value());
        number(example, "weaver_surprise_index" + tag, alone.surprise_index);
    }
    const PredictiveCheck joint = predictive_check(example.now, example.observed_tables, example.seen);
    number(example, "joint_prob_of_observed", joint.probability);
    number(example, "prior_predictive_p_joint", joint.p_value.value());
    number(example, "weaver_surprise_index_joint", joint.surprise_index);

    const Conflict found = conflict(example.now, loglik);
    number(example, "jensen_conflict_bits", found.bits);
    number(example, "jensen_conflict_nats", found.bits * std::numbers::ln2);
    const Surprise each = surprise(example.observed_tables, example.seen);
    EXPECT_TRUE(each.exact);
    for (std::size_t k = 0; k < example.causes.size(); ++k) {
        const auto place = static_cast<Eigen::Index>(k);
        number(example, "predictive_p_given_cause[" + example.causes[k] + "]", each.probability(place));
        number(example, "conf_resolved_by[" + example.causes[k] + "]_bits", found.gain_bits(place));
        EXPECT_EQ(found.explained_by[k], found.gain_bits(place) >= found.bits);
    }
}

TEST_F(InformationReference, Agrees) {
    const auto inputs = steelyard::test::reference_json("information_inputs.json");
    for (const auto& input : inputs.at("cases")) {
        const Example example(input);
        one_finding(example);
        two_findings(example);
        fit(example);
    }
    EXPECT_EQ(table_.unused(), std::vector<std::string>{});
}

}  // namespace
