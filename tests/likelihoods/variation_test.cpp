// SPDX-License-Identifier: Apache-2.0
// The spread of single readings, by hand: every expected number is computed here from the figures of the set
// beside it.
#include "steelyard/likelihoods/variation.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <array>
#include <cmath>
#include <limits>
#include <numbers>
#include <set>

#include "../engine/expect_domain_error.hpp"
#include "near.hpp"
#include "panel_of.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "table_files.hpp"

namespace steelyard::likelihoods {
namespace {

using document::Basis;
using test::near_abs;
using test::near_rel;
using test::panel_of;
using Entries = std::vector<std::pair<std::string, std::string>>;

/// The small set with figures of variation.
TableSet set_with(const std::string& variation) {
    return read_table_set(
        test::small_files_with("set.yaml", "sources:\n", "variation:\n" + variation + "sources:\n"), "small");
}

SpreadResult spread(const TableSet& set, const Entries& entries, std::string_view quantity) {
    const Panel panel = panel_of(entries);
    return spread_of(set, panel, derive(panel, set.gate.chemistry), quantity);
}

double sd(const TableSet& set, const Entries& entries, std::string_view quantity) {
    const SpreadResult result = spread(set, entries, quantity);
    EXPECT_TRUE(result.spread) << quantity << ": " << result.why_not;
    EXPECT_TRUE(result.why_not.empty());
    return result.spread ? result.spread->sd : 0.0;
}

double value(const TableSet& set, const Entries& entries, std::string_view quantity) {
    return derive(panel_of(entries), set.gate.chemistry).find(quantity)->value.low;
}

// --- Reading.

TEST(Variation, IsReadInCanonicalUnitsWithTheGroundsOfEachFigure) {
    const TableSet set = set_with(
        "  urine_dilution: {value: 20 %, basis: elicited}\n"
        "  serum_potassium:\n"
        "    within: {value: 4 %, basis: study, source: survey, note: Of healthy people}\n"
        "    analytical: {value: 60 umol/L, basis: memory}\n"
        "  urine_ph:\n"
        "    within: {value: 0.3, basis: elicited}\n"
        "    methods: {dipstick: {analytical: {value: 0.6, basis: memory}}}\n");
    ASSERT_EQ(set.variation.quantities.size(), 2U);
    const Variation& potassium = set.variation.quantities[0];
    EXPECT_EQ(potassium.quantity, "serum_potassium");
    ASSERT_TRUE(potassium.parts.within && potassium.parts.analytical);
    EXPECT_TRUE(potassium.parts.within->relative);
    EXPECT_TRUE(near_rel(0.04, potassium.parts.within->size, 1e-12));
    EXPECT_EQ(potassium.parts.within->as_given, "4 %");
    EXPECT_EQ(potassium.parts.within->note, "Of healthy people");
    EXPECT_EQ(potassium.parts.within->grounds.basis, Basis::study);
    EXPECT_EQ(potassium.parts.within->grounds.sources, std::vector<std::string>{"survey"});
    EXPECT_FALSE(potassium.parts.analytical->relative);
    EXPECT_TRUE(near_rel(0.06, potassium.parts.analytical->size, 1e-12)) << "60 umol/L is 0.06 mmol/L";
    EXPECT_EQ(potassium.parts.analytical->grounds.basis, Basis::memory);
    const Variation* ph = set.variation.find("urine_ph");
    ASSERT_NE(ph, nullptr);
    EXPECT_FALSE(ph->parts.analytical);
    ASSERT_EQ(ph->methods.size(), 1U);
    EXPECT_EQ(ph->methods[0].method, "dipstick");
    EXPECT_EQ(ph->methods[0].parts.analytical->size, 0.6);
    ASSERT_TRUE(set.variation.urine_dilution);
    EXPECT_TRUE(near_rel(0.2, set.variation.urine_dilution->size, 1e-12));
    EXPECT_EQ(set.variation.find("serum_sodium"), nullptr);
}

TEST(Variation, MayBeLeftOut) {
    const TableSet set = test::small_set();
    EXPECT_TRUE(set.variation.quantities.empty());
    EXPECT_FALSE(set.variation.urine_dilution);
    const SpreadResult result = spread(set, {{"serum_potassium", "4 mmol/L"}}, "serum_potassium");
    EXPECT_FALSE(result.spread);
    EXPECT_EQ(result.not_stated, std::vector<std::string>{"serum_potassium"});
    EXPECT_EQ(result.why_not, "no variation is stated for serum potassium");
}

TEST(UrineDilution, MovesConcentrationsAndOsmolalityOnly) {
    for (const std::string_view id : {"urine_sodium", "urine_creatinine", "urine_urate", "urine_bicarbonate",
                                      "urine_ammonium_spot", "urine_osmolality"}) {
        EXPECT_TRUE(follows_urine_dilution(id)) << id;
    }
    for (const std::string_view id : {"urine_ph", "urine_ph_after_furosemide", "urine_pco2", "urine_ammonium",
                                      "urine_citrate", "urine_anion_gap", "serum_sodium", "nothing"}) {
        EXPECT_FALSE(follows_urine_dilution(id)) << id;
    }
}

// --- Measured values.

TEST(SpreadOf, AMeasuredValueAddsBothPartsInQuadrature) {
    const TableSet set = set_with(
        "  serum_potassium:\n"
        "    within: {value: 4 %, basis: study, source: survey}\n"
        "    analytical: {value: 0.12 mmol/L, basis: elicited}\n");
    const SpreadResult result = spread(set, {{"serum_potassium", "4 mmol/L"}}, "serum_potassium");
    ASSERT_TRUE(result.spread);
    EXPECT_TRUE(near_rel(0.2, result.spread->sd, 1e-12)) << "0.16 and 0.12";
    EXPECT_EQ(result.spread->unit, "mmol/L");
    EXPECT_EQ(result.spread->weakest, Basis::elicited);
    EXPECT_EQ(result.spread->grounds.size(), 2U);
    EXPECT_TRUE(result.spread->remarks.empty());
}

TEST(SpreadOf, SaysWhenOnlyOnePartIsStated) {
    const TableSet set = set_with(
        "  serum_potassium: {within: {value: 4 %, basis: memory}}\n"
        "  serum_sodium: {analytical: {value: 1 mmol/L, basis: memory}}\n");
    const SpreadResult within = spread(set, {{"serum_potassium", "5 mmol/L"}}, "serum_potassium");
    ASSERT_TRUE(within.spread);
    EXPECT_TRUE(near_rel(0.2, within.spread->sd, 1e-12));
    EXPECT_EQ(within.spread->remarks,
              std::vector<std::string>{"no analytical part is stated apart for serum potassium"});
    const SpreadResult analytical = spread(set, {{"serum_sodium", "140 mmol/L"}}, "serum_sodium");
    ASSERT_TRUE(analytical.spread);
    EXPECT_TRUE(near_rel(1.0, analytical.spread->sd, 1e-12));
    EXPECT_EQ(analytical.spread->remarks,
              std::vector<std::string>{
                  "of serum sodium only the analytical part is stated, so the spread is too small"});
}

TEST(SpreadOf, AUrinePhTakesTheFiguresOfTheMethodStated) {
    const TableSet set = set_with(
        "  urine_ph:\n"
        "    within: {value: 0.3, basis: elicited}\n"
        "    analytical: {value: 0.4, basis: elicited}\n"
        "    methods: {dipstick: {analytical: {value: 0.72, basis: memory}}}\n");
    EXPECT_TRUE(
        near_rel(0.5, sd(set, {{"urine_ph", "6"}, {"urine_method", "electrode"}}, "urine_ph"), 1e-12));
    const SpreadResult strip = spread(set, {{"urine_ph", "6"}, {"urine_method", "dipstick"}}, "urine_ph");
    ASSERT_TRUE(strip.spread);
    EXPECT_TRUE(near_rel(0.78, strip.spread->sd, 1e-12)) << "0.3 of the patient stays, 0.72 of the strip";
    EXPECT_EQ(strip.spread->weakest, Basis::memory);
    EXPECT_TRUE(strip.spread->remarks.empty());
    const SpreadResult unknown = spread(set, {{"urine_ph", "6"}}, "urine_ph");
    ASSERT_TRUE(unknown.spread);
    EXPECT_TRUE(near_rel(0.78, unknown.spread->sd, 1e-12)) << "not stated: the widest";
    EXPECT_EQ(unknown.spread->remarks,
              std::vector<std::string>{
                  "how urine pH was measured is not stated: the spread of a dipstick, the widest, is taken"});
}

TEST(SpreadOf, AUrineConcentrationVariesByItsWholeVariationDilutionIncluded) {
    const TableSet set = set_with(
        "  urine_dilution: {value: 20 %, basis: elicited}\n"
        "  urine_sodium: {within: {value: 25 %, basis: memory}, analytical: {value: 2 mmol/L, basis: "
        "memory}}\n");
    EXPECT_TRUE(
        near_rel(std::hypot(15.0, 2.0), sd(set, {{"urine_sodium", "60 mmol/L"}}, "urine_sodium"), 1e-12));
}

// --- Computed values.

TEST(SpreadOf, TheAnionGapAddsThreeIonsInQuadrature) {
    const TableSet set = set_with(
        "  serum_sodium: {within: {value: 0.5 %, basis: memory}, analytical: {value: 1 mmol/L, basis: "
        "elicited}}\n"
        "  serum_chloride: {within: {value: 1.2 mmol/L, basis: memory}}\n"
        "  serum_bicarbonate: {within: {value: 4 %, basis: study, source: survey}}\n"
        "  serum_albumin: {within: {value: 2 g/L, basis: memory}}\n");
    const Entries gap = {{"serum_sodium", "140 mmol/L"},
                         {"serum_chloride", "110 mmol/L"},
                         {"serum_bicarbonate", "15 mmol/L"},
                         {"serum_albumin", "36 g/L"}};
    const double variance = 0.7 * 0.7 + 1.0 + 1.2 * 1.2 + 0.6 * 0.6;
    EXPECT_TRUE(near_rel(std::sqrt(variance), sd(set, gap, "anion_gap"), 1e-9));
    // Corrected: 2 g/L of albumin are 0.5 mmol/L at the slope of the set, 0.25.
    EXPECT_TRUE(near_rel(std::sqrt(variance + 0.25), sd(set, gap, "anion_gap_corrected"), 1e-9));
    const SpreadResult result = spread(set, gap, "anion_gap");
    ASSERT_TRUE(result.spread);
    EXPECT_EQ(result.spread->weakest, Basis::memory);
    EXPECT_EQ(result.spread->grounds.size(), 3U) << "memory, elicited and the study, each once";
    EXPECT_EQ(result.spread->remarks.back(),
              "the values it is computed from are taken to vary independently");
}

TEST(SpreadOf, ACorrectedGapFollowsTheSlopeOfTheSet) {
    Entries gap = {{"anion_gap", "12 mmol/L"}, {"serum_albumin", "30 g/L"}};
    TableSet set = set_with(
        "  anion_gap: {within: {value: 1.5 mmol/L, basis: memory}}\n"
        "  serum_albumin: {within: {value: 4 g/L, basis: memory}}\n");
    EXPECT_TRUE(near_rel(std::hypot(1.5, 1.0), sd(set, gap, "anion_gap_corrected"), 1e-9))
        << "a gap given in the case brings its own entry";
    set.gate.chemistry.albumin_slope = 0.5;
    EXPECT_TRUE(near_rel(std::hypot(1.5, 2.0), sd(set, gap, "anion_gap_corrected"), 1e-9));
}

const Entries potassium_excretion = {{"serum_potassium", "4 mmol/L"},
                                     {"urine_potassium", "40 mmol/L"},
                                     {"serum_creatinine", "100 umol/L"},
                                     {"urine_creatinine", "8 mmol/L"}};

TEST(SpreadOf, AFractionalExcretionAddsRelativeErrors) {
    const TableSet set = set_with(
        "  serum_potassium: {within: {value: 4 %, basis: memory}}\n"
        "  urine_potassium: {within: {value: 10 %, basis: memory}}\n"
        "  serum_creatinine: {within: {value: 5 %, basis: memory}}\n"
        "  urine_creatinine: {within: {value: 8 %, basis: memory}}\n");
    const double relative =
        sd(set, potassium_excretion, "fe_potassium") / value(set, potassium_excretion, "fe_potassium");
    // To first order sqrt of the sum of squares; a divisor with coefficient c moves by c / (1 - c^2) over one
    // standard deviation either way.
    EXPECT_TRUE(near_rel(std::sqrt(0.0016 + 0.01 + 0.0025 + 0.0064), relative, 0.005));
    const auto divisor = [](double c) { return c / (1.0 - c * c); };
    EXPECT_TRUE(near_rel(std::hypot(std::hypot(0.10, 0.05), std::hypot(divisor(0.04), divisor(0.08))),
                         relative, 1e-9));
}

TEST(SpreadOf, DilutionCancelsInARatioOfTheSameUrine) {
    const TableSet set = set_with(
        "  urine_dilution: {value: 20 %, basis: elicited}\n"
        "  serum_potassium: {within: {value: 4 %, basis: memory}}\n"
        "  urine_potassium: {within: {value: 20 %, basis: memory}}\n"
        "  serum_creatinine: {within: {value: 5 %, basis: memory}}\n"
        "  urine_creatinine: {within: {value: 20 %, basis: memory}}\n");
    const double relative =
        sd(set, potassium_excretion, "fe_potassium") / value(set, potassium_excretion, "fe_potassium");
    EXPECT_TRUE(near_rel(std::hypot(0.05, 0.04 / (1.0 - 0.0016)), relative, 1e-9))
        << "only the two serum values are left";
    const SpreadResult result = spread(set, potassium_excretion, "fe_potassium");
    EXPECT_EQ(
        result.spread->remarks.back(),
        "the values it is computed from are taken to vary independently but for the dilution of the urine");
}

TEST(SpreadOf, DilutionScalesAUrineGap) {
    const TableSet set = set_with(
        "  urine_dilution: {value: 20 %, basis: elicited}\n"
        "  urine_sodium: {within: {value: 25 %, basis: memory}, analytical: {value: 1 mmol/L, basis: "
        "memory}}\n"
        "  urine_potassium: {within: {value: 20 %, basis: memory}, analytical: {value: 1 mmol/L, basis: "
        "memory}}\n"
        "  urine_chloride: {within: {value: 20 %, basis: memory}, analytical: {value: 1 mmol/L, basis: "
        "memory}}\n");
    const Entries urine = {
        {"urine_sodium", "60 mmol/L"}, {"urine_potassium", "30 mmol/L"}, {"urine_chloride", "40 mmol/L"}};
    // Gap 50, of which dilution moves 20 %: 10. Sodium's own part is 15 % of 60: 9. Three times 1 of the
    // laboratory.
    EXPECT_TRUE(near_rel(std::sqrt(100.0 + 81.0 + 3.0), sd(set, urine, "urine_anion_gap"), 1e-9));
}

TEST(SpreadOf, FiltrationTakesThatOfCreatinineTimesTheExponentOfTheEquation) {
    const TableSet set =
        set_with("  serum_creatinine: {within: {value: 5 %, basis: study, source: survey}}\n");
    const auto relative = [&](const std::string& creatinine) {
        const Entries entries = {{"sex", "female"}, {"age", "47 a"}, {"serum_creatinine", creatinine}};
        return sd(set, entries, "gfr") / value(set, entries, "gfr");
    };
    // Above 0.7 mg/dL the rate goes with creatinine^-1.2, below with creatinine^-0.241.
    EXPECT_TRUE(near_rel(1.2 * 0.05, relative("120 umol/L"), 0.005));
    EXPECT_TRUE(near_rel((std::pow(0.95, -1.2) - std::pow(1.05, -1.2)) / 2.0, relative("120 umol/L"), 1e-9));
    EXPECT_TRUE(near_rel(0.241 * 0.05, relative("45 umol/L"), 0.005));
    // At the bend, 0.7 mg/dL, half of the step lies on either side.
    EXPECT_TRUE(near_rel((std::pow(0.95, -0.241) - std::pow(1.05, -1.2)) / 2.0, relative("0.7 mg/dL"), 1e-9));
}

TEST(SpreadOf, AStandInTakesTheVariationOfWhatWasMeasured) {
    const TableSet set = set_with(
        "  serum_bicarbonate: {within: {value: 1 mmol/L, basis: memory}}\n"
        "  serum_total_co2: {within: {value: 2 mmol/L, basis: memory}}\n"
        "  arterial_ph: {within: {value: 0.01, basis: memory}}\n"
        "  arterial_pco2: {within: {value: 2 mmHg, basis: memory}}\n");
    EXPECT_TRUE(near_rel(2.0, sd(set, {{"serum_total_co2", "16 mmol/L"}}, "serum_bicarbonate"), 1e-9));
    EXPECT_TRUE(near_rel(
        1.0,
        sd(set, {{"serum_total_co2", "16 mmol/L"}, {"serum_bicarbonate", "15 mmol/L"}}, "serum_bicarbonate"),
        1e-12));
    const Entries gas = {{"arterial_ph", "7.30"}, {"arterial_pco2", "30 mmHg"}};
    const double relative = sd(set, gas, "serum_bicarbonate") / value(set, gas, "serum_bicarbonate");
    EXPECT_TRUE(near_rel(std::hypot(0.01 * std::numbers::ln10, 2.0 / 30.0), relative, 1e-3));
}

TEST(SpreadOf, AStepOfAFormulaDoesNotBlowTheSpreadUp) {
    // TmP/GFR steps down by 4 % where the reabsorption passes 0.86. Here it is 0.86 exactly, within rounding:
    // 1 - (3.5 x 0.1) / (1.25 x 2).
    const TableSet set = set_with(
        "  serum_phosphate: {within: {value: 5 %, basis: memory}}\n"
        "  urine_phosphate: {within: {value: 5 %, basis: memory}}\n"
        "  serum_creatinine: {within: {value: 5 %, basis: memory}}\n"
        "  urine_creatinine: {within: {value: 5 %, basis: memory}}\n");
    const Entries at_step = {{"serum_phosphate", "1.25 mmol/L"},
                             {"urine_phosphate", "3.5 mmol/L"},
                             {"serum_creatinine", "100 umol/L"},
                             {"urine_creatinine", "2 mmol/L"}};
    const double relative = sd(set, at_step, "tmp_gfr") / value(set, at_step, "tmp_gfr");
    EXPECT_GT(relative, 0.04);
    EXPECT_LT(relative, 0.15);
}

TEST(SpreadOf, ShortensItsStepWhereTheFormulaHasNoValue) {
    // Excretion 99 % of the filtered load: one standard deviation more would be above it.
    const TableSet set = set_with(
        "  serum_phosphate: {within: {value: 0.001 %, basis: memory}}\n"
        "  urine_phosphate: {within: {value: 5 %, basis: memory}}\n"
        "  serum_creatinine: {within: {value: 0.001 %, basis: memory}}\n"
        "  urine_creatinine: {within: {value: 0.001 %, basis: memory}}\n");
    const Entries nearly_all = {{"serum_phosphate", "1 mmol/L"},
                                {"urine_phosphate", "19.8 mmol/L"},
                                {"serum_creatinine", "100 umol/L"},
                                {"urine_creatinine", "2 mmol/L"}};
    // TmP/GFR = phosphate (1 - 0.99): its slope in urine phosphate is -1/20, one standard deviation 0.99.
    EXPECT_TRUE(near_rel(0.99 / 20.0, sd(set, nearly_all, "tmp_gfr"), 1e-3));
}

// --- No value.

TEST(SpreadOf, AGivenValueHasItsOwnEntryOrNone) {
    const std::string creatinine = "  serum_creatinine: {within: {value: 5 %, basis: memory}}\n";
    const Entries given = {{"sex", "female"},
                           {"age", "47 a"},
                           {"serum_creatinine", "120 umol/L"},
                           {"gfr", "80 mL/min/{1.73_m2}"}};
    const SpreadResult none = spread(set_with(creatinine), given, "gfr");
    EXPECT_FALSE(none.spread);
    EXPECT_EQ(none.why_not, "no variation is stated for GFR");
    EXPECT_EQ(none.not_stated, std::vector<std::string>{"gfr"});
    const TableSet with_entry = set_with(creatinine + "  gfr: {within: {value: 10 %, basis: memory}}\n");
    EXPECT_TRUE(near_rel(8.0, sd(with_entry, given, "gfr"), 1e-12));
}

TEST(SpreadOf, NamesEveryInputWithoutAFigure) {
    const TableSet set = set_with("  serum_sodium: {within: {value: 1 mmol/L, basis: memory}}\n");
    const SpreadResult result = spread(
        set,
        {{"serum_sodium", "140 mmol/L"}, {"serum_chloride", "110 mmol/L"}, {"serum_total_co2", "15 mmol/L"}},
        "anion_gap");
    EXPECT_FALSE(result.spread);
    EXPECT_EQ(result.not_stated, (std::vector<std::string>{"serum_chloride", "serum_total_co2"}));
    EXPECT_EQ(result.why_not, "no variation is stated for serum chloride and serum total CO2");
}

TEST(SpreadOf, HasNoneForWhatIsNotKnownOrKnownOnlyAsAnInterval) {
    const TableSet set = set_with(
        "  urine_sodium: {within: {value: 24 %, basis: memory}}\n"
        "  urine_potassium: {within: {value: 24 %, basis: memory}}\n"
        "  urine_chloride: {within: {value: 24 %, basis: memory}}\n");
    const Entries censored = {
        {"urine_sodium", "<20 mmol/L"}, {"urine_potassium", "30 mmol/L"}, {"urine_chloride", "40 mmol/L"}};
    for (const std::string_view quantity : {"urine_sodium", "urine_anion_gap"}) {
        const SpreadResult result = spread(set, censored, quantity);
        EXPECT_FALSE(result.spread);
        EXPECT_NE(result.why_not.find("is known only to lie in an interval"), std::string::npos);
        EXPECT_TRUE(result.not_stated.empty());
    }
    EXPECT_TRUE(spread(set, censored, "urine_potassium").spread);
    EXPECT_EQ(spread(set, censored, "serum_sodium").why_not, "serum sodium is not known");
}

TEST(SpreadOf, HasNoneForAPercentageOfNothing) {
    const TableSet set = set_with("  urine_glucose: {within: {value: 24 %, basis: memory}}\n");
    const SpreadResult result = spread(set, {{"urine_glucose", "0 mmol/L"}}, "urine_glucose");
    EXPECT_FALSE(result.spread);
    EXPECT_EQ(result.why_not, "the variation stated for urine glucose comes to nothing at this value");
}

// --- Beside an edge.

TEST(ChanceOnRepeat, IsThatOfTheDifferenceOfTwoReadings) {
    EXPECT_EQ(chance_on_repeat(3.5, 3.5, 0.2), 0.5);
    // Phi(-1) = 0.158655 and Phi(-1.96) = 0.024998, from printed tables of the normal distribution; the
    // difference of two readings has standard deviation sqrt(2) x 0.2.
    EXPECT_TRUE(near_abs(0.158655, chance_on_repeat(3.5, 3.5 + std::numbers::sqrt2 * 0.2, 0.2), 1e-6));
    EXPECT_TRUE(near_abs(0.158655, chance_on_repeat(3.5, 3.5 - std::numbers::sqrt2 * 0.2, 0.2), 1e-6));
    // A change by the reference change value, 2.77 standard deviations, is seen once in forty each way.
    EXPECT_TRUE(near_abs(0.024998, chance_on_repeat(0.0, 1.96 * std::numbers::sqrt2, 1.0), 1e-6));
}

TEST(ChanceOnRepeat, FallsWithDistanceAndRisesWithSpreadAndIsNeverAboveAHalf) {
    EXPECT_TRUE(rc::check([] {
        const double value = *rc::gen::inRange(-1000, 1000) / 10.0;
        const double distance = *rc::gen::inRange(0, 500) / 10.0;
        const double sd = *rc::gen::inRange(1, 500) / 10.0;
        const double chance = chance_on_repeat(value, value + distance, sd);
        RC_ASSERT(chance >= 0.0);
        RC_ASSERT(chance <= 0.5);
        RC_ASSERT(chance_on_repeat(value, value + distance + 1.0, sd) <= chance);
        RC_ASSERT(chance_on_repeat(value, value + distance, sd + 1.0) >= chance);
    }));
}

TEST(ChanceOnRepeat, RefusesWhatIsNoSpreadOrNoNumber) {
    for (const double bad : {0.0, -1.0, std::nan("")}) {
        EXPECT_THROW(chance_on_repeat(1.0, 2.0, bad), engine::DomainError) << bad;
    }
    for (const double bad : {std::nan(""), std::numeric_limits<double>::infinity()}) {
        EXPECT_THROW(chance_on_repeat(bad, 2.0, 1.0), engine::DomainError);
        EXPECT_THROW(chance_on_repeat(1.0, bad, 1.0), engine::DomainError);
        EXPECT_THROW(nearest_edge(bad, std::array{1.0}), engine::DomainError);
    }
    test::expect_domain_error(
        [] {
            nearest_edge(1.0, std::array{1.0, 2.0, 2.0});
        },
        "nearest_edge", "edges", {2, {}}, 2.0, "finite and above the edge before it");
    test::expect_domain_error([] { nearest_edge(1.0, std::span<const double>()); }, "nearest_edge",
                              "edges size", {}, 0.0, "at least 1");
}

TEST(NearestEdgeOf, SaysHowFarAndWhatLiesBeyond) {
    constexpr std::array edges = {2.5, 3.0, 3.5, 5.0};
    const auto expect = [&](double value, double edge, double distance, Eigen::Index beyond) {
        const NearestEdge nearest = nearest_edge(value, edges);
        EXPECT_EQ(nearest.edge, edge) << value;
        EXPECT_TRUE(near_abs(distance, nearest.distance, 1e-12)) << value;
        EXPECT_EQ(nearest.band_beyond, beyond) << value;
    };
    expect(1.0, 2.5, 1.5, 1);
    expect(3.1, 3.0, -0.1, 1);
    expect(3.4, 3.5, 0.1, 3);
    expect(9.0, 5.0, -4.0, 3);
    expect(3.25, 3.0, -0.25, 1);  // equally near: the lower edge
    expect(3.5, 3.5, 0.0, 2);     // on an edge, so in the band above: the lower lies beyond
    const double rounded = 32.3 + 20.3 - 49.1;
    ASSERT_NE(rounded, 3.5);
    expect(rounded, 3.5, 0.0, 2);
    EXPECT_EQ(nearest_edge(rounded, edges).distance, 0.0);
}

TEST(NearestEdgeOf, LeavesTheBandOfTheValueByOneStep) {
    EXPECT_TRUE(rc::check([] {
        const std::vector<double> edges = {-20.0, 0.0, 20.0, 40.0};
        const double value = *rc::gen::inRange(-700, 700) / 10.0;
        Eigen::Index band = 0;
        for (const double edge : edges) {
            band += value >= edge ? 1 : 0;
        }
        const NearestEdge nearest = nearest_edge(value, edges);
        RC_ASSERT(std::abs(nearest.band_beyond - band) == 1);
        RC_ASSERT((nearest.distance > 0.0) == (nearest.band_beyond > band));
        for (const double edge : edges) {
            RC_ASSERT(std::abs(nearest.distance) <= std::abs(edge - value));
        }
    }));
}

// --- The shipped set.

const TableSet& adult() {
    static const TableSet set = load_table_set(STEELYARD_SOURCE_DIR "/likelihoods/tables/adult");
    return set;
}

/// Every quantity that a table or one of its conditions reads.
std::set<std::string> quantities_read(const TableSet& set) {
    std::set<std::string> ids;
    for (const EvidenceTable& table : set.tables) {
        if (table.kind == FindingKind::quantity) {
            ids.insert(table.finding);
        }
        for (std::size_t i = 0; i < table.joint_of.size(); ++i) {
            if (!table.joint_edges[i].empty()) {
                ids.insert(table.joint_of[i]);
            }
        }
        for (const Condition& condition : table.usable_when) {
            if (!condition.is_feature) {
                ids.insert(condition.subject);
            }
        }
    }
    return ids;
}

const Entries whole_case = {{"sex", "female"},
                            {"age", "47 a"},
                            {"serum_sodium", "139 mmol/L"},
                            {"serum_potassium", "3.1 mmol/L"},
                            {"serum_chloride", "114 mmol/L"},
                            {"serum_bicarbonate", "21 mmol/L"},
                            {"serum_albumin", "38 g/L"},
                            {"serum_creatinine", "90 umol/L"},
                            {"serum_glucose", "5 mmol/L"},
                            {"serum_urea", "6 mmol/L"},
                            {"serum_phosphate", "0.9 mmol/L"},
                            {"serum_urate", "250 umol/L"},
                            {"serum_osmolality", "290 mosm/kg"},
                            {"urine_ph", "6.4"},
                            {"urine_method", "electrode"},
                            {"urine_ph_after_furosemide", "6.2"},
                            {"urine_sodium", "60 mmol/L"},
                            {"urine_potassium", "40 mmol/L"},
                            {"urine_chloride", "70 mmol/L"},
                            {"urine_urea", "150 mmol/L"},
                            {"urine_glucose", "1 mmol/L"},
                            {"urine_osmolality", "420 mosm/kg"},
                            {"urine_creatinine", "6 mmol/L"},
                            {"urine_calcium", "3 mmol/L"},
                            {"urine_phosphate", "15 mmol/L"},
                            {"urine_urate", "2000 umol/L"},
                            {"urine_bicarbonate", "12 mmol/L"},
                            {"urine_ammonium", "25 mmol/d"},
                            {"urine_citrate", "0.8 mmol/d"}};

Entries without(Entries entries, const std::set<std::string>& names, const Entries& more) {
    entries.erase(std::remove_if(entries.begin(), entries.end(),
                                 [&](const auto& entry) { return names.contains(entry.first); }),
                  entries.end());
    entries.insert(entries.end(), more.begin(), more.end());
    return entries;
}

TEST(AdultVariation, IsStatedForEverythingThatATableReads) {
    for (const std::string& quantity : quantities_read(adult())) {
        const SpreadResult result = spread(adult(), whole_case, quantity);
        EXPECT_TRUE(result.spread) << quantity << ": " << result.why_not;
        const Variation* entry = adult().variation.find(quantity);
        EXPECT_TRUE(find_derived(quantity) != nullptr ||
                    (entry != nullptr && entry->parts.analytical && entry->parts.within))
            << quantity << " lacks a part";
    }
}

TEST(AdultVariation, IsStatedForEveryWayToThoseQuantities) {
    const std::vector<std::pair<Entries, std::vector<std::string>>> ways = {
        {without(whole_case, {"serum_bicarbonate"}, {{"serum_total_co2", "22 mmol/L"}}),
         {"serum_bicarbonate", "anion_gap_corrected", "fe_bicarbonate"}},
        {without(whole_case, {"serum_bicarbonate"}, {{"arterial_bicarbonate", "21 mmol/L"}}),
         {"serum_bicarbonate"}},
        {without(whole_case, {"serum_bicarbonate"}, {{"arterial_ph", "7.3"}, {"arterial_pco2", "32 mmHg"}}),
         {"serum_bicarbonate"}},
        {without(whole_case, {"serum_bicarbonate"}, {{"venous_bicarbonate", "21 mmol/L"}}),
         {"serum_bicarbonate"}},
        {without(whole_case, {"serum_bicarbonate"}, {{"venous_ph", "7.28"}, {"venous_pco2", "38 mmHg"}}),
         {"serum_bicarbonate"}},
        {without(whole_case, {"serum_osmolality"}, {}), {"ttkg"}},
        {without(whole_case, {"urine_glucose"}, {}), {"urine_osmolal_gap"}},
        {without(whole_case, {"urine_bicarbonate"}, {{"urine_pco2", "50 mmHg"}}), {"fe_bicarbonate"}},
        {without(whole_case, {"urine_method"}, {{"urine_method", "dipstick"}}), {"urine_ph"}},
        {without(whole_case, {}, {{"gfr", "82 mL/min/{1.73_m2}"}}), {"gfr"}}};
    for (const auto& [entries, quantities] : ways) {
        for (const std::string& quantity : quantities) {
            const SpreadResult result = spread(adult(), entries, quantity);
            EXPECT_TRUE(result.spread) << quantity << ": " << result.why_not;
        }
    }
}

TEST(AdultVariation, AgreesWithPrintedCriticalDifferences) {
    // Harding 1987, Clin Chem 33:1416-1418, abstract: a change is real beyond 5.6 mmHg of pCO2, 0.04 of pH
    // and 2.6 mmol/L of bicarbonate, that is 1.96 sqrt(2) standard deviations. From the printed goals, which
    // are rounded to one figure, the latter two come out wider.
    const Entries gas = {
        {"arterial_ph", "7.30"}, {"arterial_pco2", "30 mmHg"}, {"arterial_bicarbonate", "15 mmol/L"}};
    const double factor = 1.96 * std::numbers::sqrt2;
    EXPECT_TRUE(near_abs(5.6, factor * sd(adult(), gas, "arterial_pco2"), 0.05));
    EXPECT_TRUE(near_abs(0.04, factor * sd(adult(), gas, "arterial_ph"), 0.0105));
    EXPECT_TRUE(near_abs(2.6, factor * sd(adult(), gas, "arterial_bicarbonate"), 0.6));
    // Front Med 2022;9:1009358, abstract: reference change of an estimated filtration rate 16.5 %.
    const double rate = value(adult(), whole_case, "gfr");
    EXPECT_TRUE(near_abs(0.165, factor * sd(adult(), whole_case, "gfr") / rate, 0.025));
    const Entries given = without(whole_case, {}, {{"gfr", "80 mL/min/{1.73_m2}"}});
    EXPECT_TRUE(near_abs(0.165, factor * sd(adult(), given, "gfr") / 80.0, 0.002));
    // Abbott, Investig Clin Urol, abstract: limits of agreement of dipstick and electrode, -1.47 to 1.02.
    const Variation* ph = adult().variation.find("urine_ph");
    ASSERT_EQ(ph->methods.size(), 1U);
    EXPECT_TRUE(near_abs((1.02 + 1.47) / (2.0 * 1.96), ph->methods[0].parts.analytical->size, 0.005));
}

TEST(AdultVariation, NamesForEveryStudyWhereItWasSeen) {
    const auto check = [](const std::optional<VariationFigure>& figure, const std::string& what) {
        if (!figure || document::is_judged(figure->grounds.basis) ||
            figure->grounds.basis == Basis::practice) {
            return;
        }
        for (const std::string& key : figure->grounds.sources) {
            const document::Source* source = document::find_source(adult().sources, key);
            ASSERT_NE(source, nullptr) << key;
            EXPECT_FALSE(source->seen.empty()) << what << " " << key;
        }
    };
    for (const Variation& entry : adult().variation.quantities) {
        check(entry.parts.analytical, entry.quantity);
        check(entry.parts.within, entry.quantity);
        for (const MethodVariation& method : entry.methods) {
            check(method.parts.analytical, entry.quantity);
            check(method.parts.within, entry.quantity);
        }
    }
}

}  // namespace
}  // namespace steelyard::likelihoods
