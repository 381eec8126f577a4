// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/gate.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <map>
#include <string>
#include <vector>

#include "near.hpp"
#include "panel_of.hpp"

namespace steelyard::likelihoods {
namespace {

using test::panel_of;
using Entries = std::map<std::string, std::string>;

GateSettings settings() {
    GateSettings s;
    s.bicarbonate_low.value = 22;
    s.ph_low.value = 7.35;
    s.ph_high.value = 7.45;
    s.gap_normal_to.value = 12;
    s.gap_high_from.value = 16;
    s.gfr_reduced_below.value = 45;
    s.expected_pco2_band.value = 5;
    s.gas_bicarbonate.value = 2;
    s.gas_ph.value = 0.04;
    s.age_least.value = 18;
    s.pco2_high.value = 45;
    s.lactate_high.value = 4;
    s.ketones_high.value = 3;
    s.alkali_feature = "alkali_therapy";
    s.pregnancy_feature = "pregnancy";
    s.gfr_conditions = {{"changing_creatinine", "absent", "creatinine is still changing"}};
    return s;
}

GateResult gate_of(const Panel& panel) {
    return gate(panel, derive(panel), settings());
}

/// A metabolic acidosis with a normal gap, with some entries replaced; an empty text takes an entry out.
GateResult gate_with(const Entries& changes) {
    Entries entries{{"age", "47 a"},
                    {"serum_sodium", "139 mmol/L"},
                    {"serum_chloride", "115 mmol/L"},
                    {"serum_bicarbonate", "14 mmol/L"},
                    {"serum_albumin", "38 g/L"},
                    {"arterial_ph", "7.28"},
                    {"arterial_pco2", "30 mmHg"},
                    {"gfr", "82 mL/min/{1.73_m2}"}};
    for (const auto& [name, text] : changes) {
        entries[name] = text;
    }
    std::vector<std::pair<std::string, std::string>> given;
    for (const auto& [name, text] : entries) {
        if (!text.empty()) {
            given.emplace_back(name, text);
        }
    }
    return gate_of(panel_of(given));
}

::testing::AssertionResult says(const GateResult& result, const std::string& words) {
    for (const std::string& reason : result.reasons) {
        if (reason.find(words) != std::string::npos) {
            return ::testing::AssertionSuccess();
        }
    }
    auto failure = ::testing::AssertionFailure() << "no reason says \"" << words << "\":";
    for (const std::string& reason : result.reasons) {
        failure << "\n  " << reason;
    }
    return failure;
}

// 139 - 115 - 14 = 10, + 0.25 x 2 = 10.5, 1.5 x 14 + 8 = 29, 0.5 / 10 = 0.05: by hand.
TEST(Gate, LetsTheWorkedCaseInAndShowsItsSums) {
    const GateResult result = gate_with({});
    EXPECT_EQ(result.status, GateStatus::in_scope);
    const std::map<std::string, double> sums(result.quantities.begin(), result.quantities.end());
    EXPECT_DOUBLE_EQ(sums.at("anion_gap"), 10.0);
    EXPECT_DOUBLE_EQ(sums.at("anion_gap_corrected"), 10.5);
    EXPECT_DOUBLE_EQ(sums.at("expected_pco2"), 29.0);
    EXPECT_DOUBLE_EQ(sums.at("delta_ratio"), 0.05);
    EXPECT_TRUE(test::near_abs(13.94, sums.at("bicarbonate_from_gas"), 0.005));
    EXPECT_TRUE(says(result, "bicarbonate 14 mmol/L is below 22 mmol/L"));
    EXPECT_TRUE(says(result, "pCO2 30 mmHg is as expected"));
    EXPECT_TRUE(says(result, "anion gap corrected for albumin 10.5 mmol/L is normal"));
    EXPECT_TRUE(says(result, "delta ratio 0.05"));
}

struct Rule {
    const char* name;
    Entries changes;
    GateStatus status;
    const char* words;
};

void PrintTo(const Rule& rule, std::ostream* out) {
    *out << rule.name;
}

class GateRules : public ::testing::TestWithParam<Rule> {};

TEST_P(GateRules, GiveTheirStatusAndSayWhy) {
    const Rule& rule = GetParam();
    const GateResult result = gate_with(rule.changes);
    EXPECT_EQ(to_string(result.status), to_string(rule.status));
    EXPECT_TRUE(says(result, rule.words));
    // The gravest reason stands first.
    if (rule.status != GateStatus::in_scope) {
        EXPECT_NE(result.reasons.front().find(rule.words), std::string::npos) << result.reasons.front();
    }
}

constexpr GateStatus in = GateStatus::in_scope;
constexpr GateStatus caution = GateStatus::caution;
constexpr GateStatus out = GateStatus::out_of_scope;

INSTANTIATE_TEST_SUITE_P(
    Acidosis, GateRules,
    ::testing::Values(
        Rule{"child", {{"age", "17 a"}}, out, "adults"},
        Rule{"just adult", {{"age", "18 a"}}, in, "below 22"},
        Rule{"no bicarbonate",
             {{"serum_bicarbonate", ""}, {"arterial_ph", ""}, {"arterial_pco2", ""}},
             caution,
             "no bicarbonate was given"},
        Rule{"bicarbonate from the gas",
             {{"serum_bicarbonate", ""}},
             in,
             "bicarbonate 13.9 mmol/L (computed from arterial pH and pCO2) is below 22 mmol/L"},
        Rule{"bicarbonate from total CO2",
             {{"serum_bicarbonate", ""}, {"serum_total_co2", "15 mmol/L"}},
             in,
             "bicarbonate 14 mmol/L (total CO2 15 less 1) is below 22 mmol/L"},
        Rule{"age not given", {{"age", ""}}, in, "age was not given: the tables are for adults"},
        Rule{"pregnant", {{"pregnancy", "present"}}, caution, "pregnancy lowers bicarbonate"},
        Rule{"not pregnant", {{"pregnancy", "absent"}}, in, "below 22"},
        // 0.0307 x 44 x 10^1.23 = 22.9: acidaemia, but neither bicarbonate nor pCO2 is out of its range.
        Rule{"acidaemia without a high pCO2",
             {{"serum_bicarbonate", "22.5 mmol/L"},
              {"arterial_ph", "7.33"},
              {"arterial_pco2", "44 mmHg"},
              {"serum_chloride", "106 mmol/L"}},
             caution,
             "arterial pH 7.33 is below 7.35 while bicarbonate 22.5 mmol/L is not below 22 mmol/L: a mild, "
             "treated or mixed disorder"},
        Rule{"acidaemia with pCO2 at the limit",
             {{"serum_bicarbonate", "23 mmol/L"},
              {"arterial_ph", "7.32"},
              {"arterial_pco2", "45 mmHg"},
              {"serum_chloride", "106 mmol/L"}},
             caution,
             "a mild, treated or mixed disorder"},
        Rule{"acidaemia with pCO2 unknown",
             {{"serum_bicarbonate", "22.5 mmol/L"},
              {"arterial_ph", "7.33"},
              {"arterial_pco2", ""},
              {"serum_chloride", "106 mmol/L"}},
             caution,
             "a mild, treated or mixed disorder"},
        Rule{"bicarbonate at the limit",
             {{"serum_bicarbonate", "22 mmol/L"},
              {"arterial_ph", ""},
              {"arterial_pco2", ""},
              {"serum_chloride", "106 mmol/L"}},
             out,
             "no metabolic acidosis"},
        Rule{"alkali given",
             {{"serum_bicarbonate", "24 mmol/L"},
              {"arterial_ph", ""},
              {"arterial_pco2", ""},
              {"serum_chloride", "105 mmol/L"},
              {"alkali_therapy", "present"}},
             caution,
             "treated acidosis"},
        Rule{"alkali denied",
             {{"serum_bicarbonate", "24 mmol/L"},
              {"arterial_ph", ""},
              {"arterial_pco2", ""},
              {"serum_chloride", "105 mmol/L"},
              {"alkali_therapy", "absent"}},
             out,
             "no metabolic acidosis"},
        Rule{"respiratory acidosis",
             {{"serum_bicarbonate", "28 mmol/L"},
              {"arterial_ph", "7.25"},
              {"arterial_pco2", "65 mmHg"},
              {"serum_chloride", "100 mmol/L"}},
             out,
             "respiratory acidosis"},
        Rule{"censored across the limit",
             {{"serum_bicarbonate", "<25 mmol/L"},
              {"arterial_ph", ""},
              {"arterial_pco2", ""},
              {"anion_gap", "10 mmol/L"}},
             caution,
             "could not be confirmed"},
        Rule{"censored below the limit",
             {{"serum_bicarbonate", "<22 mmol/L"},
              {"arterial_ph", ""},
              {"arterial_pco2", ""},
              {"anion_gap", "10 mmol/L"}},
             in,
             "is below 22 mmol/L"},
        Rule{"bicarbonate a hair below the limit is not shown on it",
             {{"serum_bicarbonate", "21.96 mmol/L"},
              {"serum_chloride", "107 mmol/L"},
              {"arterial_ph", ""},
              {"arterial_pco2", ""}},
             in,
             "bicarbonate 21.96 mmol/L is below 22 mmol/L"},
        Rule{"no gas", {{"arterial_ph", ""}, {"arterial_pco2", ""}}, in, "respiratory alkalosis"},
        Rule{"venous gas, acidaemic",
             {{"arterial_ph", ""}, {"arterial_pco2", ""}, {"venous_ph", "7.1"}, {"venous_pco2", "50 mmHg"}},
             in,
             "venous pH 7.10 speaks against a primary respiratory alkalosis; breathing cannot be judged from "
             "a "
             "venous gas"},
        Rule{"venous gas, between",
             {{"arterial_ph", ""}, {"arterial_pco2", ""}, {"venous_ph", "7.38"}},
             in,
             "venous pH 7.38 does not exclude a respiratory alkalosis"},
        Rule{"venous gas, alkalaemic",
             {{"arterial_ph", ""}, {"arterial_pco2", ""}, {"venous_ph", "7.5"}},
             caution,
             "venous pH 7.50 is above 7.45"}));

INSTANTIATE_TEST_SUITE_P(
    Compensation, GateRules,
    ::testing::Values(
        // 0.0307 x 24 x 10^(7.50 - 6.1) = 18.5
        Rule{"alkalaemia",
             {{"serum_bicarbonate", "18.5 mmol/L"},
              {"arterial_ph", "7.50"},
              {"arterial_pco2", "24 mmHg"},
              {"serum_chloride", "110 mmol/L"}},
             out,
             "primary respiratory alkalosis"},
        // expected 1.5 x 18 + 8 = 35; 26 is below 30; pH 7.43: 0.0307 x 26 x 21.4 = 17.1
        Rule{"respiratory alkalosis within the normal pH",
             {{"serum_bicarbonate", "18 mmol/L"},
              {"arterial_ph", "7.43"},
              {"arterial_pco2", "26 mmHg"},
              {"serum_chloride", "110 mmol/L"}},
             out,
             "primary respiratory alkalosis"},
        Rule{"added respiratory alkalosis, pH between",
             {{"serum_bicarbonate", "16 mmol/L"},
              {"arterial_ph", "7.38"},
              {"arterial_pco2", "26 mmHg"},
              {"serum_chloride", "112 mmol/L"}},
             caution,
             "added respiratory alkalosis"},
        // expected 29; 23 is below 24; 0.0307 x 23 x 10^1.25 = 12.6
        Rule{"added respiratory alkalosis with acidaemia",
             {{"serum_bicarbonate", "14 mmol/L"}, {"arterial_ph", "7.34"}, {"arterial_pco2", "23 mmHg"}},
             caution,
             "added respiratory alkalosis"},
        // expected 29; 38 is above 34; 0.0307 x 38 x 10^1.08 = 14.0
        Rule{"added respiratory acidosis",
             {{"arterial_ph", "7.18"}, {"arterial_pco2", "38 mmHg"}},
             caution,
             "added respiratory acidosis"},
        Rule{"compensated",
             {{"serum_bicarbonate", "20 mmol/L"},
              {"arterial_ph", "7.36"},
              {"arterial_pco2", "36 mmHg"},
              {"serum_chloride", "109 mmol/L"}},
             in,
             "is not below 7.35"},
        // At the edge of the band pCO2 is still compensation: expected 29, 34 is within 5.
        Rule{
            "edge of the band", {{"arterial_ph", "7.23"}, {"arterial_pco2", "34 mmHg"}}, in, "as expected"}));

INSTANTIATE_TEST_SUITE_P(
    Gas, GateRules,
    ::testing::Values(
        // pH 7.28 and pCO2 30 imply 13.94; 17 is 3.06 away, and 0.086 in pH: both beyond 2 and 0.04.
        Rule{"disagrees", {{"arterial_bicarbonate", "17 mmol/L"}}, caution, "does not quite agree"},
        // 19: 5.06 away and 0.134 in pH, more than twice both.
        Rule{"contradicts", {{"arterial_bicarbonate", "19 mmol/L"}}, out, "contradicts itself"},
        Rule{"serum disagrees",
             {{"serum_bicarbonate", "17 mmol/L"}, {"serum_chloride", "112 mmol/L"}},
             caution,
             "serum bicarbonate is 17 mmol/L"},
        // 15.5: 1.56 away (within 2) though 0.046 in pH: one measure alone says nothing.
        Rule{"one measure", {{"arterial_bicarbonate", "15.5 mmol/L"}}, in, "below 22"}));

INSTANTIATE_TEST_SUITE_P(
    Gap, GateRules,
    ::testing::Values(
        // chloride 112: gap 13, corrected 13.5
        Rule{"between, GFR good", {{"serum_chloride", "112 mmol/L"}}, caution, "not confirmed"},
        Rule{"between, GFR unknown",
             {{"serum_chloride", "112 mmol/L"}, {"gfr", ""}},
             caution,
             "not confirmed"},
        Rule{"between, GFR low",
             {{"serum_chloride", "112 mmol/L"}, {"gfr", "20 mL/min/{1.73_m2}"}},
             in,
             "may account for it"},
        // chloride 105: gap 20, corrected 20.5
        Rule{"high, GFR good", {{"serum_chloride", "105 mmol/L"}}, out, "high-gap acidosis"},
        Rule{"high, GFR unknown",
             {{"serum_chloride", "105 mmol/L"}, {"gfr", ""}},
             caution,
             "must be excluded"},
        Rule{"high, GFR low",
             {{"serum_chloride", "105 mmol/L"}, {"gfr", "20 mL/min/{1.73_m2}"}},
             caution,
             "GFR 20 mL/min/1.73 m² is below 45 mL/min/1.73 m²: renal failure is among the causes, but "
             "lactate, ketones and toxins must be excluded"},
        Rule{"high, GFR not valid",
             {{"serum_chloride", "105 mmol/L"},
              {"gfr", "20 mL/min/{1.73_m2}"},
              {"changing_creatinine", "present"}},
             caution,
             "GFR 20 mL/min/1.73 m² is not used (creatinine is still changing): lactate, ketones and toxins "
             "must be excluded"},
        Rule{"high, good GFR not valid",
             {{"serum_chloride", "105 mmol/L"}, {"changing_creatinine", "present"}},
             caution,
             "GFR 82 mL/min/1.73 m² is not used"},
        Rule{"between, GFR not valid",
             {{"serum_chloride", "112 mmol/L"},
              {"gfr", "20 mL/min/{1.73_m2}"},
              {"changing_creatinine", "present"}},
             caution,
             "a normal gap was not confirmed, and GFR 20 mL/min/1.73 m² is not used"},
        Rule{"high, GFR low, lactate high",
             {{"serum_chloride", "105 mmol/L"},
              {"gfr", "20 mL/min/{1.73_m2}"},
              {"serum_lactate", "12 mmol/L"}},
             out,
             "lactate 12 mmol/L is above 4 mmol/L: a lactic acidosis, which these tables do not weigh"},
        Rule{"high, GFR low, ketones high",
             {{"serum_chloride", "105 mmol/L"},
              {"gfr", "20 mL/min/{1.73_m2}"},
              {"serum_beta_hydroxybutyrate", "6.2 mmol/L"}},
             out,
             "beta-hydroxybutyrate 6.2 mmol/L is above 3 mmol/L: a ketoacidosis, which"},
        Rule{"high, GFR low, lactate and ketones at their limits",
             {{"serum_chloride", "105 mmol/L"},
              {"gfr", "20 mL/min/{1.73_m2}"},
              {"serum_lactate", "4 mmol/L"},
              {"serum_beta_hydroxybutyrate", "3 mmol/L"}},
             caution,
             "but toxins must be excluded"},
        Rule{"high, GFR low, lactate perhaps high",
             {{"serum_chloride", "105 mmol/L"},
              {"gfr", "20 mL/min/{1.73_m2}"},
              {"serum_lactate", "<6 mmol/L"}},
             caution,
             "lactate, ketones and toxins"},
        Rule{"normal, lactate high",
             {{"serum_lactate", "5 mmol/L"}},
             caution,
             "lactate 5 mmol/L is above 4 mmol/L though the gap is not high"},
        Rule{"hidden by a low albumin",
             {{"serum_albumin", "12 g/L"}, {"serum_chloride", "114 mmol/L"}},
             out,
             "high-gap acidosis"},
        Rule{"no albumin, low",
             {{"serum_albumin", ""}, {"serum_chloride", "117 mmol/L"}},
             in,
             "if albumin is low"},
        Rule{"no albumin, near", {{"serum_albumin", ""}}, caution, "without albumin"},
        Rule{"no albumin, over",
             {{"serum_albumin", ""}, {"serum_chloride", "108 mmol/L"}},
             caution,
             "without albumin"},
        Rule{"no albumin, far over",
             {{"serum_albumin", ""}, {"serum_chloride", "100 mmol/L"}},
             out,
             "high-gap acidosis"},
        Rule{"no albumin, far over, GFR low",
             {{"serum_albumin", ""}, {"serum_chloride", "100 mmol/L"}, {"gfr", "10 mL/min/{1.73_m2}"}},
             caution,
             "lactate, ketones and toxins must be excluded"},
        Rule{"no chloride", {{"serum_chloride", ""}}, caution, "anion gap is not known"},
        Rule{"very low", {{"serum_chloride", "123 mmol/L"}}, caution, "lithium, bromide, a paraprotein"},
        Rule{"negative", {{"serum_chloride", "130 mmol/L"}}, caution, "lithium, bromide, a paraprotein"},
        Rule{"normal at the limit",
             {{"serum_chloride", "113 mmol/L"}, {"serum_albumin", "40 g/L"}},
             in,
             "is normal"},
        Rule{"high limit not passed",
             {{"serum_chloride", "109 mmol/L"}, {"serum_albumin", "40 g/L"}},
             caution,
             "not clearly above"}));

// 140.3 - 110.1 - 14.2 is 16 to a clinician and 16.000000000000014 in floating point; with a chloride of
// 114.1 it is 12, and the limits themselves belong to the side that is not beyond them.
TEST(Gate, ComparesSumsWithTheirLimitsAsAClinicianDoes) {
    const Entries at_sixteen{{"serum_sodium", "140.3 mmol/L"},
                             {"serum_chloride", "110.1 mmol/L"},
                             {"serum_bicarbonate", "14.2 mmol/L"},
                             {"serum_albumin", "40 g/L"}};
    GateResult result = gate_with(at_sixteen);
    EXPECT_EQ(result.status, GateStatus::caution);
    EXPECT_TRUE(says(result, "16 mmol/L is above 12 mmol/L but not clearly above 16 mmol/L"));
    Entries at_twelve = at_sixteen;
    at_twelve["serum_chloride"] = "114.1 mmol/L";
    result = gate_with(at_twelve);
    EXPECT_EQ(result.status, GateStatus::in_scope);
    EXPECT_TRUE(says(result, "12 mmol/L is normal, not above 12 mmol/L"));
    Entries over = at_sixteen;
    over["serum_chloride"] = "110.0 mmol/L";
    EXPECT_EQ(gate_with(over).status, GateStatus::out_of_scope);
    EXPECT_TRUE(says(gate_with(over), "16.1 mmol/L is above 16 mmol/L"));
}

// All gaps on a tenth from 11 to 17, made of sodium and chloride on tenths: never a gap called above itself.
TEST(Gate, NeverPutsATenthBesideItself) {
    for (int tenths = 110; tenths <= 170; ++tenths) {
        for (const int sodium : {1303, 1391, 1403, 1407}) {
            Panel panel;
            const auto set = [&](const char* id, double value) {
                panel.measured[id] = Reading{Interval::point(value), "", "", {}};
            };
            set("serum_sodium", sodium / 10.0);
            set("serum_chloride", (sodium - 142 - tenths) / 10.0);
            set("serum_bicarbonate", 14.2);
            set("serum_albumin", 40);
            panel.age = 50;
            const GateStatus expected = tenths <= 120 ? GateStatus::in_scope : GateStatus::caution;
            EXPECT_EQ(gate_of(panel).status, expected) << tenths << " " << sodium;
            EXPECT_EQ(bool(says(gate_of(panel), "is above 16 mmol/L and GFR is not known")), tenths > 160);
        }
    }
}

TEST(Gate, DoesNotCallALowGapNormal) {
    for (const char* albumin : {"40 g/L", ""}) {
        const GateResult result = gate_with({{"serum_chloride", "123 mmol/L"}, {"serum_albumin", albumin}});
        EXPECT_FALSE(says(result, "is normal"));
        EXPECT_TRUE(says(result, "is below 3 mmol/L"));
    }
}

// Sodium 139, chloride 103, bicarbonate 18, albumin 40: gap 18, 8 above its centre of 10, while bicarbonate
// has fallen by 6: 1.33.
TEST(Gate, ExplainsADeltaRatioAboveOneWithoutAPercentage) {
    const GateResult result = gate_with({{"serum_chloride", "103 mmol/L"},
                                         {"serum_bicarbonate", "18 mmol/L"},
                                         {"serum_albumin", "40 g/L"},
                                         {"arterial_ph", ""},
                                         {"arterial_pco2", ""}});
    EXPECT_TRUE(says(result,
                     "delta ratio 1.33: the gap has risen by more than bicarbonate has fallen: think "
                     "of a metabolic alkalosis beside it, or a high bicarbonate before"));
    EXPECT_FALSE(says(result, "133 %"));
    // Chloride 105: gap 16, 6 above its centre: exactly one.
    EXPECT_TRUE(says(gate_with({{"serum_chloride", "105 mmol/L"},
                                {"serum_bicarbonate", "18 mmol/L"},
                                {"serum_albumin", "40 g/L"},
                                {"arterial_ph", ""},
                                {"arterial_pco2", ""}}),
                     "delta ratio 1.00: the rise of the gap accounts for 100 %"));
}

TEST(Gate, DoesNotJudgeBreathingFromAGasThatContradictsItself) {
    // pH 7.28 and pCO2 30 imply 13.94, but 19 was printed.
    const GateResult result = gate_with({{"arterial_bicarbonate", "19 mmol/L"}});
    EXPECT_TRUE(says(result, "check the transcription or repeat the gas"));
    EXPECT_FALSE(says(result, "as expected"));
    EXPECT_FALSE(says(result, "arterial pH 7.28 is below"));
}

TEST(Gate, SaysThatAGfrWasEstimated) {
    // Creatinine 180 umol/L (2.036 mg/dL), man of 50: 142 (2.036 / 0.9)^-1.2 0.9938^50 = 39.0, by hand.
    const GateResult result = gate_of(panel_of({{"age", "50 a"},
                                                {"sex", "male"},
                                                {"serum_creatinine", "180 umol/L"},
                                                {"serum_sodium", "139 mmol/L"},
                                                {"serum_chloride", "111 mmol/L"},
                                                {"serum_bicarbonate", "14 mmol/L"},
                                                {"serum_albumin", "40 g/L"}}));
    EXPECT_TRUE(says(result, "GFR 39 mL/min/1.73 m² (estimated from creatinine) is below 45 mL/min/1.73 m²"));
    EXPECT_EQ(result.status, GateStatus::in_scope);
}

TEST(Gate, NeverShowsTheEndOfAPlausibleRange) {
    // 139 - 115 - [1, 14): above 10; the other end rests on the least plausible bicarbonate.
    const GateResult result =
        gate_with({{"serum_bicarbonate", "<14 mmol/L"}, {"arterial_ph", ""}, {"arterial_pco2", ""}});
    EXPECT_TRUE(says(result, "bicarbonate below 14 mmol/L is below 22 mmol/L"));
    EXPECT_TRUE(says(result, "anion gap corrected for albumin above 10.5 mmol/L"));
    for (const std::string& reason : result.reasons) {
        EXPECT_EQ(reason.find("23"), std::string::npos) << reason;
    }
}

TEST(GateInputs, NameTheFeaturesOfTheSettings) {
    const std::vector<std::string> ids = gate_inputs(settings());
    for (const char* id :
         {"serum_lactate", "venous_ph", "alkali_therapy", "pregnancy", "changing_creatinine"}) {
        EXPECT_NE(std::find(ids.begin(), ids.end(), id), ids.end()) << id;
    }
    const std::vector<std::string> bare = gate_inputs(GateSettings{});
    EXPECT_EQ(std::count(bare.begin(), bare.end(), ""), 0);
}

// A published patient (Brandis, Acid-base Physiology, clinical case 31, read with the usual references 12 and
// 24): Na 143, Cl 120, HCO3 12.5, gap 10.5, delta ratio -0.13, a pure normal-gap acidosis; pH 7.20, pCO2 31
// (expected 26.75).
TEST(Gate, ReadsAPublishedCaseAsItsAuthorDoes) {
    const Panel panel = panel_of({{"serum_sodium", "143 mmol/L"},
                                  {"serum_chloride", "120 mmol/L"},
                                  {"serum_bicarbonate", "12.5 mmol/L"},
                                  {"serum_albumin", "40 g/L"},
                                  {"arterial_ph", "7.20"},
                                  {"arterial_pco2", "31 mmHg"},
                                  {"age", "45 a"}});
    GateSettings usual = settings();
    usual.chemistry.anion_gap_reference = 12;
    const GateResult result = gate(panel, derive(panel, usual.chemistry), usual);
    EXPECT_EQ(result.status, GateStatus::in_scope);
    EXPECT_TRUE(says(result, "delta ratio -0.13: the gap has not risen"));
}

TEST(Gate, HasAtLeastOneReasonForAnyPanel) {
    const GateResult empty = gate_of(Panel{});
    EXPECT_EQ(empty.status, GateStatus::caution);
    EXPECT_TRUE(empty.quantities.empty());
    EXPECT_TRUE(rc::check("never without words, gravest first", [] {
        Panel panel;
        const auto maybe = [&](const char* id, int low, int high, double scale) {
            if (*rc::gen::inRange(0, 4) != 0) {
                const double a = *rc::gen::inRange(low, high) / scale;
                const double b =
                    *rc::gen::inRange(0, 3) == 0 ? a + *rc::gen::inRange(0, high - low) / scale : a;
                panel.measured[id] = Reading{{a, b, false, a != b}, "", "", {}};
            }
        };
        maybe("serum_sodium", 110, 170, 1);
        maybe("serum_chloride", 80, 140, 1);
        maybe("serum_bicarbonate", 20, 400, 10);
        maybe("serum_albumin", 10, 50, 1);
        maybe("arterial_ph", 680, 770, 100);
        maybe("arterial_pco2", 10, 90, 1);
        maybe("arterial_bicarbonate", 20, 400, 10);
        if (*rc::gen::arbitrary<bool>()) {
            panel.given["gfr"] = Reading{Interval::point(*rc::gen::inRange(5, 120)), "", "", {}};
        }
        const GateResult result = gate_of(panel);
        RC_ASSERT(!result.reasons.empty());
        RC_ASSERT(std::none_of(result.reasons.begin(), result.reasons.end(), [](const std::string& r) {
            return r.empty() || r.find("nan") != std::string::npos;
        }));
    }));
}

TEST(Gate, LeavesCensoredSumsOut) {
    const GateResult result = gate_with({{"serum_chloride", "<115 mmol/L"}});
    for (const auto& [id, value] : result.quantities) {
        EXPECT_NE(id, "anion_gap");
        EXPECT_NE(id, "delta_ratio");
    }
    EXPECT_EQ(result.status, GateStatus::caution);
}

std::vector<UrgentLimit> limits() {
    // Means of a US survey of laboratories, JAMA 1990;263:704-707, and a posted list: as the shipped set has
    // them.
    return {{"serum_potassium", 2.8, 6.2, {}},
            {"arterial_ph", 7.20, 7.60, {}},
            {"serum_bicarbonate", 10.0, 40.0, {}},
            {"serum_total_co2", 10.0, 40.0, {}}};
}

std::vector<UrgentValue> urgent_of(const std::vector<std::pair<std::string, std::string>>& entries) {
    return urgent_values(derive(panel_of(entries)), limits());
}

TEST(UrgentValues, AreThoseAtOrBeyondALimitInTheOrderOfTheLimits) {
    const auto urgent = urgent_of(
        {{"arterial_ph", "7.10"}, {"serum_potassium", "2.8 mmol/L"}, {"serum_bicarbonate", "10.1 mmol/L"}});
    ASSERT_EQ(urgent.size(), 2U);
    EXPECT_EQ(urgent[0].quantity, "serum_potassium");
    EXPECT_EQ(urgent[0].value, 2.8);
    EXPECT_EQ(urgent[0].limit, 2.8);
    EXPECT_EQ(urgent[0].unit, "mmol/L");
    EXPECT_TRUE(urgent[0].is_low);
    EXPECT_EQ(urgent[1].quantity, "arterial_ph");
    EXPECT_TRUE(urgent_of({{"serum_potassium", "2.9 mmol/L"}}).empty());
    EXPECT_FALSE(urgent_of({{"serum_potassium", "6.2 mmol/L"}})[0].is_low);
    EXPECT_TRUE(urgent_of({}).empty());
}

TEST(UrgentValues, CountACensoredValueWhenAllOfItIsBeyondTheLimit) {
    EXPECT_EQ(urgent_of({{"serum_potassium", "<2.8 mmol/L"}}).size(), 1U);
    EXPECT_TRUE(urgent_of({{"serum_potassium", "<2.8 mmol/L"}})[0].certain);
    const auto high = urgent_of({{"serum_potassium", ">8 mmol/L"}});
    ASSERT_EQ(high.size(), 1U);
    EXPECT_EQ(high[0].value, 8.0);
    EXPECT_FALSE(high[0].is_low);
    EXPECT_TRUE(high[0].certain);
}

TEST(UrgentValues, SayWhenACensoredValueOnlyReachesTheLimit) {
    const auto low = urgent_of({{"serum_potassium", "<3.0 mmol/L"}});
    ASSERT_EQ(low.size(), 1U);
    EXPECT_FALSE(low[0].certain);
    EXPECT_TRUE(low[0].is_low);
    EXPECT_EQ(low[0].value, 3.0);
    EXPECT_EQ(low[0].shown, "below 3.0");
    EXPECT_EQ(low[0].interval.high, 3.0);
    const auto high = urgent_of({{"serum_potassium", ">6.0 mmol/L"}});
    ASSERT_EQ(high.size(), 1U);
    EXPECT_FALSE(high[0].certain || high[0].is_low);
    EXPECT_EQ(high[0].value, 6.0);
    // All of it lies above 2.8, and 6.2 is not reached.
    EXPECT_TRUE(urgent_of({{"serum_potassium", "3.4 mmol/L"}}).empty());
    Quantities between;
    between.known["serum_potassium"] = {{2.8, 6.2, true, true}, "mmol/L", Origin::measured, {}};
    EXPECT_TRUE(urgent_values(between, limits()).empty()) << "open ends do not reach";
    between.known["serum_potassium"].value = {2.8, 6.2};
    EXPECT_EQ(urgent_values(between, limits()).size(), 2U) << "closed ones do";
}

TEST(UrgentValues, AreShownWithTheDecimalsOfTheirLimit) {
    EXPECT_EQ(urgent_of({{"serum_potassium", "<2 mmol/L"}})[0].shown, "below 2.0");
    EXPECT_EQ(urgent_of({{"serum_potassium", "2.75 mmol/L"}})[0].shown, "2.75");
    EXPECT_EQ(urgent_of({{"arterial_ph", "7.1"}})[0].shown, "7.10");
    EXPECT_EQ(urgent_of({{"arterial_ph", "7.25"}, {"arterial_pco2", "20 mmHg"}})[0].shown, "8.7");
}

TEST(UrgentValues, StandAtTheirLimitInSpiteOfRounding) {
    // 0.1 + 0.2 in floating point is a hair above 0.3.
    Quantities quantities;
    quantities.known["serum_potassium"] = {Interval::point(2.5 + 0.1 + 0.2), "mmol/L", Origin::given, {}};
    EXPECT_EQ(urgent_values(quantities, limits()).size(), 1U);
}

TEST(UrgentValues, HaveOneLineForABicarbonateTakenFromTotalCo2) {
    auto urgent = urgent_of({{"serum_total_co2", "9 mmol/L"}});
    ASSERT_EQ(urgent.size(), 1U);
    EXPECT_EQ(urgent[0].quantity, "serum_total_co2");
    urgent = urgent_of({{"serum_total_co2", "10.5 mmol/L"}});
    ASSERT_EQ(urgent.size(), 1U);
    EXPECT_EQ(urgent[0].quantity, "serum_bicarbonate");
    // Total CO2 may be at or below 10, but bicarbonate is sure to be.
    urgent = urgent_of({{"serum_total_co2", "<11 mmol/L"}});
    ASSERT_EQ(urgent.size(), 1U);
    EXPECT_EQ(urgent[0].quantity, "serum_bicarbonate");
    EXPECT_TRUE(urgent[0].certain);
    // A low pH beside a bicarbonate computed from it is another fact.
    EXPECT_EQ(urgent_of({{"arterial_ph", "7.05"}, {"arterial_pco2", "20 mmHg"}}).size(), 2U);
}

TEST(UrgentValues, CountABicarbonateThatIsKnownFromTheGasOnly) {
    // 0.0307 x 20 x 10^(7.25 - 6.1) = 8.67
    const auto urgent = urgent_of({{"arterial_ph", "7.25"}, {"arterial_pco2", "20 mmHg"}});
    ASSERT_EQ(urgent.size(), 1U);
    EXPECT_EQ(urgent[0].quantity, "serum_bicarbonate");
}

}  // namespace
}  // namespace steelyard::likelihoods
