// SPDX-License-Identifier: Apache-2.0
// The open data sets audited by the built program: every figure as reference libraries give it.
#include <gtest/gtest.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "open_data.hpp"
#include "reference_table.hpp"
#include "run_program.hpp"

namespace steelyard::test {
namespace {

nlohmann::json audited(const OpenData& data) {
    std::vector<std::string> words = {"audit", data.cases_file(), "--as", "json", "--replicates", "20"};
    for (const std::string& word : data.sets()) {
        words.push_back(word);
    }
    const Outcome outcome = run(words);
    EXPECT_EQ(outcome.code, 0) << outcome.err;
    return nlohmann::json::parse(outcome.out);
}

/// Every figure of one data set under one prior set, the posteriors apart.
void expect_every_figure(const ReferenceTable& table, const OpenData& data, const nlohmann::json& audit) {
    const nlohmann::json& figures = audit["figures"];
    const auto expect = [&](const std::string& quantity, const nlohmann::json& value) {
        EXPECT_TRUE(table.matches(data.id, quantity, value.get<double>()));
    };
    const double patients = figures["patients"].get<double>();
    const nlohmann::json& top = figures["top"][0];
    expect("audit_n", figures["patients"]);
    expect("log_score_nats", figures["scores"]["log_score"]["value"]);
    expect("brier_sum_over_classes", figures["scores"]["brier"]["value"]);
    expect("top1_count", std::round(top["value"].get<double>() * patients));
    expect("top1_wilson_lower", top["low"]);
    expect("top1_wilson_upper", top["high"]);
    expect("ece_top_label_10_bins", figures["leader"]["calibration_error"]["value"]);
    for (std::size_t i = 0; i < data.causes.size(); ++i) {
        EXPECT_EQ(audit["causes"][i]["id"], data.causes[i]);
        for (std::size_t j = 0; j < data.causes.size(); ++j) {
            expect("confusion[truth=" + std::to_string(i) + " called=" + std::to_string(j) + "]",
                   figures["confusion"][i][j]);
        }
    }
    if (data.causes.size() == 2) {
        const nlohmann::json& cause = figures["causes"][1];
        expect("auc", cause["area"]["value"]);
        if (table.has(data.id, "auc_delong_lower")) {
            expect("auc_delong_lower", cause["area"]["low"]);
            expect("auc_delong_upper", cause["area"]["high"]);
        }
        expect("cox_intercept", cause["intercept"]["value"]);
        expect("cox_slope", cause["slope"]["value"]);
        expect("spiegelhalter_z", cause["spiegelhalter"]["z"]);
    } else {
        expect("hand_till_M", figures["hand_till"]["value"]);
        expect("spiegelhalter_z_multiclass", figures["scores"]["spiegelhalter"]["z"]);
    }
}

TEST(OpenDataAudit, GivesEveryFigureOfTheReferenceLibraries) {
    const ReferenceTable table("open_data.csv");
    for (const OpenData& data : {urine, urine_nine_to_one, wine}) {
        expect_every_figure(table, data, audited(data));
    }
    std::vector<std::string> forgotten;
    for (const std::string& name : table.unused()) {
        if (name.find(" posterior") == std::string::npos && !name.starts_with("URINE_LOO")) {
            forgotten.push_back(name);
        }
    }
    EXPECT_EQ(forgotten, std::vector<std::string>());
}

TEST(OpenDataAudit, AnotherPriorMovesOnlyTheIntercept) {
    const nlohmann::json as_found = audited(urine)["figures"]["causes"][1];
    const nlohmann::json nine_to_one = audited(urine_nine_to_one)["figures"]["causes"][1];
    EXPECT_TRUE(near_rel(as_found["area"]["value"], nine_to_one["area"]["value"], 1e-14));
    EXPECT_TRUE(near_rel(as_found["slope"]["value"], nine_to_one["slope"]["value"], 1e-9));
    // The log odds of every patient move by the same amount, so the intercept moves by the slope times as
    // much.
    const double moved = std::log(34.0 / 45.0) - std::log(1.0 / 9.0);
    EXPECT_TRUE(near_rel(
        as_found["intercept"]["value"].get<double>() + moved * as_found["slope"]["value"].get<double>(),
        nine_to_one["intercept"]["value"], 1e-7));
}

}  // namespace
}  // namespace steelyard::test
