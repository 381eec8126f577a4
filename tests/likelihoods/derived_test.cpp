// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/derived.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <set>
#include <string>
#include <vector>

#include "near.hpp"
#include "panel_of.hpp"
#include "steelyard/likelihoods/box.hpp"

namespace steelyard::likelihoods {
namespace {

using test::panel_of;
using Entries = std::vector<std::pair<std::string, std::string>>;

Quantities derive_from(const Entries& entries) {
    return derive(panel_of(entries));
}

double point(const Quantities& quantities, std::string_view id) {
    const QuantityValue* value = quantities.find(id);
    EXPECT_NE(value, nullptr) << id;
    if (value == nullptr) {
        return std::nan("");
    }
    EXPECT_TRUE(value->value.is_point()) << id;
    return value->value.low;
}

const Entries worked{{"sex", "female"},
                     {"age", "47 a"},
                     {"serum_sodium", "139 mmol/L"},
                     {"serum_potassium", "2.8 mmol/L"},
                     {"serum_chloride", "115 mmol/L"},
                     {"serum_bicarbonate", "14 mmol/L"},
                     {"serum_albumin", "38 g/L"},
                     {"serum_creatinine", "74 umol/L"},
                     {"arterial_ph", "7.28"},
                     {"arterial_pco2", "30 mmHg"},
                     {"urine_ph", "6.9"},
                     {"urine_sodium", "60 mmol/L"},
                     {"urine_potassium", "32 mmol/L"},
                     {"urine_chloride", "70 mmol/L"}};

// By hand: 139 - 115 - 14 = 10; + 0.25 x 2 = 10.5; 1.5 x 14 + 8 = 29; 0.5 / 10 = 0.05; 60 + 32 - 70 = 22.
TEST(Derive, ComputesTheWorkedCase) {
    const Quantities q = derive_from(worked);
    EXPECT_DOUBLE_EQ(point(q, "anion_gap"), 10.0);
    EXPECT_DOUBLE_EQ(point(q, "anion_gap_corrected"), 10.5);
    EXPECT_DOUBLE_EQ(point(q, "expected_pco2"), 29.0);
    EXPECT_DOUBLE_EQ(point(q, "delta_ratio"), 0.05);
    EXPECT_DOUBLE_EQ(point(q, "urine_anion_gap"), 22.0);
    EXPECT_DOUBLE_EQ(point(q, "chloride_sodium_ratio"), 115.0 / 139.0);
    EXPECT_DOUBLE_EQ(point(q, "urine_ammonium_estimate"), 82 - 0.8 * 22);
    EXPECT_TRUE(test::near_abs(0.0307 * 30 * std::pow(10.0, 1.18), point(q, "bicarbonate_from_gas"), 1e-12));
    EXPECT_EQ(q.find("anion_gap")->origin, Origin::computed);
    EXPECT_EQ(q.find("anion_gap")->from,
              (std::vector<std::string>{"serum_sodium", "serum_chloride", "serum_bicarbonate"}));
    EXPECT_EQ(q.find("serum_sodium")->origin, Origin::measured);
    EXPECT_EQ(q.lacking.at("tmp_gfr"),
              (std::vector<std::string>{"urine_phosphate", "serum_phosphate", "urine_creatinine"}));
}

TEST(Derive, KnowsOrSaysWhatIsLackingForEveryDerivedQuantity) {
    for (const Entries& entries : {Entries{}, worked}) {
        const Quantities q = derive_from(entries);
        for (const DerivedQuantity& derived : derived_quantities()) {
            const bool known = q.find(derived.id) != nullptr;
            const auto lacking = q.lacking.find(derived.id);
            EXPECT_NE(known, lacking != q.lacking.end()) << derived.id;
            if (lacking != q.lacking.end()) {
                ASSERT_FALSE(lacking->second.empty()) << derived.id;
                EXPECT_FALSE(lacking->second.front().empty()) << derived.id;
            }
        }
    }
}

TEST(DerivedQuantities, HaveDistinctIdsKnownUnitsAndASource) {
    std::set<std::string_view> ids;
    for (const DerivedQuantity& derived : derived_quantities()) {
        EXPECT_TRUE(ids.insert(derived.id).second) << derived.id;
        EXPECT_EQ(find_analyte(derived.id), nullptr) << derived.id;
        ASSERT_TRUE(read_unit(derived.unit).unit) << derived.id;
        EXPECT_FALSE(derived.formula.empty() || derived.source.empty() || derived.title.empty())
            << derived.id;
        EXPECT_LT(derived.plausible_low, derived.plausible_high) << derived.id;
    }
    EXPECT_EQ(ids.size(), 23U);
}

TEST(Derive, LetsAGivenValueReplaceTheComputedOne) {
    Entries entries = worked;
    entries.emplace_back("gfr", "55 mL/min/{1.73_m2}");
    entries.emplace_back("anion_gap", "13 mmol/L");
    const Quantities q = derive_from(entries);
    EXPECT_EQ(q.find("gfr")->origin, Origin::given);
    EXPECT_DOUBLE_EQ(point(q, "gfr"), 55.0);
    // What rests on a given value uses it: 13 + 0.5 = 13.5; 3.5 / 10 = 0.35.
    EXPECT_DOUBLE_EQ(point(q, "anion_gap_corrected"), 13.5);
    EXPECT_DOUBLE_EQ(point(q, "delta_ratio"), 0.35);
}

TEST(Derive, FindsAStandInForBicarbonateInTheStatedOrder) {
    Entries entries{{"venous_ph", "7.25"},
                    {"venous_pco2", "40 mm[Hg]"},
                    {"venous_bicarbonate", "17 mmol/L"},
                    {"arterial_ph", "7.28"},
                    {"arterial_pco2", "30 mm[Hg]"},
                    {"arterial_bicarbonate", "15 mmol/L"},
                    {"serum_total_co2", "16.5 mmol/L"},
                    {"serum_bicarbonate", "14 mmol/L"}};
    EXPECT_EQ(derive_from(entries).find("serum_bicarbonate")->origin, Origin::measured);
    entries.pop_back();
    Quantities q = derive_from(entries);
    EXPECT_EQ(q.find("serum_bicarbonate")->origin, Origin::computed);
    EXPECT_DOUBLE_EQ(point(q, "serum_bicarbonate"), 15.5);
    EXPECT_EQ(q.find("serum_bicarbonate")->from, std::vector<std::string>{"serum_total_co2"});
    EXPECT_FALSE(q.find("expected_pco2")->remarks.empty());  // and what rests on it says so
    entries.pop_back();
    EXPECT_DOUBLE_EQ(point(derive_from(entries), "serum_bicarbonate"), 15.0);
    entries.pop_back();
    q = derive_from(entries);
    EXPECT_DOUBLE_EQ(point(q, "serum_bicarbonate"), point(q, "bicarbonate_from_gas"));
    EXPECT_EQ(q.find("serum_bicarbonate")->from, (std::vector<std::string>{"arterial_ph", "arterial_pco2"}));
    entries.pop_back();
    EXPECT_DOUBLE_EQ(point(derive_from(entries), "serum_bicarbonate"), 17.0);
    entries.resize(2);
    q = derive_from(entries);
    EXPECT_EQ(q.find("serum_bicarbonate")->from, (std::vector<std::string>{"venous_ph", "venous_pco2"}));
    entries.pop_back();
    EXPECT_EQ(derive_from(entries).find("serum_bicarbonate"), nullptr);
}

TEST(Derive, DoesNotAssumeAnAlbumin) {
    Entries entries = worked;
    entries.erase(std::find(entries.begin(), entries.end(),
                            std::pair<std::string, std::string>("serum_albumin", "38 g/L")));
    const Quantities q = derive_from(entries);
    EXPECT_NE(q.find("anion_gap"), nullptr);
    EXPECT_EQ(q.find("anion_gap_corrected"), nullptr);
    EXPECT_EQ(q.lacking.at("anion_gap_corrected"), std::vector<std::string>{"serum_albumin"});
    EXPECT_EQ(q.lacking.at("delta_ratio"), std::vector<std::string>{"serum_albumin"});
}

TEST(Derive, NeedsAnAdultAgeAndASexForGfr) {
    const Entries creatinine{{"serum_creatinine", "88 umol/L"}};
    EXPECT_EQ(derive_from(creatinine).lacking.at("gfr"), (std::vector<std::string>{"sex", "age"}));
    Entries child = creatinine;
    child.emplace_back("sex", "male");
    child.emplace_back("age", "17.9 a");
    EXPECT_NE(derive_from(child).lacking.at("gfr").front().find("18"), std::string::npos);
    child.back().second = "18 a";
    EXPECT_NE(derive_from(child).find("gfr"), nullptr);
}

// 1.00 mg/dL, 40 years, man: 97.58 by the published equation; given as mg/dL, which must come back exactly.
TEST(Derive, ComputesGfrFromTheCreatinineAsItWasGiven) {
    const Quantities q = derive_from({{"serum_creatinine", "1.00 mg/dL"}, {"sex", "male"}, {"age", "40 a"}});
    EXPECT_TRUE(test::near_abs(97.575110570932148, point(q, "gfr"), 1e-10));
}

TEST(Derive, MatchesTheUnitsOfBothCreatinines) {
    // 100 x (40 / 140) x (88.42 / 5304) = 0.47630 %: by hand, creatinines in umol/L both.
    const Quantities q = derive_from({{"urine_sodium", "40 mmol/L"},
                                      {"serum_sodium", "140 mmol/L"},
                                      {"urine_creatinine", "5304 umol/L"},
                                      {"serum_creatinine", "88.42 umol/L"}});
    EXPECT_TRUE(test::near_abs(0.47630, point(q, "fe_sodium"), 5e-6));
    // 100 x (30 / 3.0) x (1.0 / 80) = 12.5 %: all in mg/dL.
    const Quantities u = derive_from({{"urine_urate", "30 mg/dL"},
                                      {"serum_urate", "3.0 mg/dL"},
                                      {"urine_creatinine", "80 mg/dL"},
                                      {"serum_creatinine", "1.0 mg/dL"}});
    EXPECT_TRUE(test::near_rel(12.5, point(u, "fe_urate"), 1e-14));
}

TEST(Derive, TakesUrineBicarbonateMeasuredOrElseFromPHAndPCO2) {
    Entries entries{{"serum_bicarbonate", "25 mmol/L"}, {"serum_creatinine", "1.0 mg/dL"},
                    {"urine_creatinine", "24 mg/dL"},   {"urine_ph", "7.5"},
                    {"urine_pco2", "60 mmHg"},          {"urine_sodium", "100 mmol/L"},
                    {"urine_potassium", "50 mmol/L"}};
    // 100 x (42.831067347135 / 25) x (1 / 24)
    EXPECT_TRUE(test::near_abs(7.1385112245225, point(derive_from(entries), "fe_bicarbonate"), 1e-9));
    entries.emplace_back("urine_bicarbonate", "120 mmol/L");
    EXPECT_TRUE(test::near_rel(20.0, point(derive_from(entries), "fe_bicarbonate"), 1e-13));
}

TEST(Derive, PutsUrineGlucoseIntoTheOsmolalGapOrSaysThatItDidNot) {
    Entries entries{{"urine_osmolality", "550 mosm/kg"},
                    {"urine_sodium", "40 mmol/L"},
                    {"urine_potassium", "30 mmol/L"},
                    {"urine_urea", "250 mmol/L"}};
    Quantities q = derive_from(entries);
    EXPECT_DOUBLE_EQ(point(q, "urine_osmolal_gap"), 160.0);
    EXPECT_DOUBLE_EQ(point(q, "urine_ammonium_estimate"), 80.0);
    ASSERT_EQ(q.find("urine_osmolal_gap")->remarks.size(), 1U);
    entries.emplace_back("urine_glucose", "50 mmol/L");
    q = derive_from(entries);
    EXPECT_DOUBLE_EQ(point(q, "urine_osmolal_gap"), 110.0);
    EXPECT_TRUE(q.find("urine_osmolal_gap")->remarks.empty());
    EXPECT_EQ(q.find("urine_osmolal_gap")->from.back(), "urine_glucose");
    // Glycosuria seen but not measured: the gap would read too high and is not computed.
    entries.back() = {"glycosuria", "present"};
    EXPECT_EQ(derive_from(entries).lacking.at("urine_osmolal_gap"),
              std::vector<std::string>{"glycosuria is present and urine glucose was not given"});
    Entries less(entries.begin() + 1, entries.end());
    EXPECT_EQ(derive_from(less).lacking.at("urine_osmolal_gap"),
              (std::vector<std::string>{"urine_osmolality", "urine_glucose"}));
    entries.back() = {"glycosuria", "absent"};
    EXPECT_DOUBLE_EQ(point(derive_from(entries), "urine_osmolal_gap"), 160.0);
}

TEST(Derive, CalculatesOsmolalityForTheGradientWhereItWasNotMeasured) {
    Entries entries{{"urine_potassium", "40 mmol/L"},    {"serum_potassium", "6.0 mmol/L"},
                    {"urine_osmolality", "600 mosm/kg"}, {"serum_sodium", "140 mmol/L"},
                    {"serum_glucose", "5 mmol/L"},       {"serum_urea", "5 mmol/L"}};
    Quantities q = derive_from(entries);
    EXPECT_TRUE(test::near_rel(40.0 / 6.0 / (600.0 / 290.0), point(q, "ttkg"), 1e-14));
    EXPECT_EQ(q.find("ttkg")->remarks.size(), 1U);
    entries.emplace_back("serum_osmolality", "300 mosm/kg");
    q = derive_from(entries);
    EXPECT_TRUE(test::near_rel(40.0 / 6.0 / 2.0, point(q, "ttkg"), 1e-14));
    EXPECT_TRUE(q.find("ttkg")->remarks.empty());
}

TEST(Derive, GivesReasonsAndNotNumbersOutsideAFormulasDomain) {
    EXPECT_NE(derive_from({{"serum_sodium", "140 mmol/L"},
                           {"serum_chloride", "104 mmol/L"},
                           {"serum_bicarbonate", "26 mmol/L"},
                           {"serum_albumin", "40 g/L"}})
                  .lacking.at("delta_ratio")
                  .front()
                  .find("24"),
              std::string::npos);
    EXPECT_NE(derive_from({{"urine_sodium", "20 mmol/L"}, {"urine_chloride", "0 mmol/L"}})
                  .lacking.at("urine_sodium_chloride_ratio")
                  .front()
                  .find("chloride"),
              std::string::npos);
    EXPECT_NE(derive_from({{"urine_sodium", "20 mmol/L"}, {"urine_chloride", "<5 mmol/L"}})
                  .lacking.count("urine_sodium_chloride_ratio"),
              0U);
}

TEST(ImageOfBox, KeepsOpenAndClosedEndsApart) {
    const Formula difference = [](const std::vector<double>& x) { return x[0] - x[1]; };
    // [1, 3) - [0, 2]: from 1 - 2, attained, up to 3 - 0, not attained.
    EXPECT_EQ(*image_of_box({{1, 3, false, true}, {0, 2, false, false}}, difference),
              (Interval{-1, 3, false, true}));
    EXPECT_EQ(*image_of_box({{1, 3, true, false}, {0, 2, false, true}}, difference),
              (Interval{-1, 3, true, false}));
    EXPECT_EQ(*image_of_box({Interval::point(5), Interval::point(2)}, difference), Interval::point(3));
    // An end that two corners share is attained if one of them is.
    const Formula product = [](const std::vector<double>& x) { return x[0] * x[1]; };
    EXPECT_EQ(*image_of_box({{0, 1, false, true}, {0, 1, false, true}}, product),
              (Interval{0, 1, false, true}));
    EXPECT_FALSE(
        image_of_box({{0, 1, false, false}}, [](const std::vector<double>& x) { return 1.0 / x[0]; }));
}

/// An entry that may be censored, with a range to draw true values from.
struct Spread {
    const char* id;
    const char* unit;
    double low, high;
};

const std::vector<Spread> spreads{
    {"serum_sodium", "mmol/L", 120, 160},      {"serum_potassium", "mmol/L", 2, 8},
    {"serum_chloride", "mmol/L", 90, 130},     {"serum_bicarbonate", "mmol/L", 5, 23},
    {"serum_albumin", "g/L", 15, 50},          {"serum_creatinine", "umol/L", 40, 900},
    {"serum_urea", "mmol/L", 2, 50},           {"serum_glucose", "mmol/L", 3, 40},
    {"serum_phosphate", "mmol/L", 0.3, 3},     {"serum_urate", "umol/L", 50, 700},
    {"serum_osmolality", "mosm/kg", 260, 340}, {"urine_ph", "", 4.5, 8},
    {"urine_sodium", "mmol/L", 5, 200},        {"urine_potassium", "mmol/L", 5, 100},
    {"urine_chloride", "mmol/L", 5, 200},      {"urine_urea", "mmol/L", 20, 500},
    {"urine_glucose", "mmol/L", 0, 100},       {"urine_phosphate", "mmol/L", 0.5, 8},
    {"urine_calcium", "mmol/L", 0.2, 10},      {"urine_creatinine", "mmol/L", 2, 20},
    {"urine_urate", "umol/L", 100, 5000},      {"urine_osmolality", "mosm/kg", 80, 1000},
    {"urine_pco2", "mm[Hg]", 20, 120},         {"arterial_ph", "", 7.0, 7.5},
    {"arterial_pco2", "mm[Hg]", 12, 60}};

Panel with_readings(const std::vector<Interval>& values) {
    Panel panel;
    panel.sex = Sex::female;
    panel.age = 50;
    for (std::size_t i = 0; i < spreads.size(); ++i) {
        panel.measured[spreads[i].id] = Reading{values[i], "", spreads[i].unit, {}};
    }
    return panel;
}

TEST(Derive, GivesIntervalsThatContainEveryPointOfTheBox) {
    EXPECT_TRUE(rc::check("corners bound the box", [] {
        std::vector<Interval> box;
        std::vector<Interval> inside;
        for (const Spread& spread : spreads) {
            const auto draw = [&] {
                return spread.low + (spread.high - spread.low) * *rc::gen::inRange(0, 10001) / 10000.0;
            };
            double a = draw();
            double b = draw();
            if (a > b) {
                std::swap(a, b);
            }
            const bool censored = *rc::gen::inRange(0, 3) == 0;
            box.push_back(censored ? Interval{a, b, false, false} : Interval::point(a));
            const double share = *rc::gen::inRange(0, 1001) / 1000.0;
            inside.push_back(Interval::point(censored ? std::clamp(a + share * (b - a), a, b) : a));
        }
        const Quantities of_box = derive(with_readings(box));
        const Quantities of_point = derive(with_readings(inside));
        for (const DerivedQuantity& derived : derived_quantities()) {
            const QuantityValue* wide = of_box.find(derived.id);
            const QuantityValue* narrow = of_point.find(derived.id);
            if (wide == nullptr) {
                continue;  // outside the domain at some corner
            }
            RC_ASSERT(narrow != nullptr);
            const double value = narrow->value.low;
            const double slack = 1e-12 * (1.0 + std::abs(value));
            RC_ASSERT(wide->value.low - slack <= value);
            RC_ASSERT(value <= wide->value.high + slack);
        }
    }));
}

// Urine phosphate 12, creatinines 0.08 and 7.1429: 12 x 0.08 / 7.1429 = 0.1344, so that reabsorption passes
// 0.86 at a serum phosphate of 0.96. By hand: TmP/GFR is 0.8156 at 0.95, 0.8064 at 0.97, but 0.82692 x 0.96 =
// 0.7938 just above 0.96 and 0.86 x 0.96 = 0.8256 just below it: both extremes lie inside the box, not at its
// corners.
TEST(Derive, BoundsTheStepOfTmpGfr) {
    Panel panel;
    panel.measured["urine_phosphate"] = Reading{Interval::point(12), "", "mmol/L", {}};
    panel.measured["urine_creatinine"] = Reading{Interval::point(7.142857142857143), "", "mmol/L", {}};
    panel.measured["serum_creatinine"] = Reading{Interval::point(80), "", "umol/L", {}};
    for (int i = 0; i <= 200; ++i) {
        panel.measured["serum_phosphate"] = Reading{{0.95, 0.97, false, false}, "", "mmol/L", {}};
        const Interval wide = derive(panel).find("tmp_gfr")->value;
        panel.measured["serum_phosphate"] = Reading{Interval::point(0.95 + 0.0001 * i), "", "mmol/L", {}};
        const double value = derive(panel).find("tmp_gfr")->value.low;
        EXPECT_LE(wide.low, value) << i;
        EXPECT_GE(wide.high, value) << i;
    }
}

TEST(Derive, HasTheEndsOfACensoredInput) {
    Entries entries = worked;
    for (auto& [name, text] : entries) {
        if (name == "urine_chloride") {
            text = "<20 mmol/L";
        }
    }
    // 60 + 32 - [0, 20): from 72, not attained, to 92, which rests on the floor of chloride alone.
    EXPECT_EQ(derive_from(entries).find("urine_anion_gap")->value,
              (Interval{72, 92, true, false, false, true}));
}

TEST(ImageOfBox, TellsMeasuredEndsFromFloorsAndCeilings) {
    const Formula difference = [](const std::vector<double>& x) { return x[0] - x[1]; };
    const Interval below_five{0, 5, false, true, true, false};
    const Interval above_two{2, 9, true, false, false, true};
    // [0, 5) - 1: its low end is the floor's.
    EXPECT_EQ(*image_of_box({below_five, Interval::point(1)}, difference),
              (Interval{-1, 4, false, true, true, false}));
    // 1 - [0, 5): what was the floor is the ceiling now.
    EXPECT_EQ(*image_of_box({Interval::point(1), below_five}, difference),
              (Interval{-4, 1, true, false, false, true}));
    // [0, 5) - (2, 9]: below 3, and nothing known at the other end.
    EXPECT_EQ(*image_of_box({below_five, above_two}, difference),
              (Interval{-9, 3, false, true, true, false}));
    // An end that a measured corner attains as well is measured: 0 x 1 and 0 x [1, 3].
    const Formula product = [](const std::vector<double>& x) { return x[0] * x[1]; };
    EXPECT_EQ(*image_of_box({{0, 2, false, false, false, false}, {1, 3, false, false, true, false}}, product),
              (Interval{0, 6, false, false, false, false}));
}

TEST(Derive, UsesTheClinicsCoefficients) {
    ChemistrySettings settings;
    settings.albumin_reference = 44;
    settings.expected_pco2_slope = 1.54;
    settings.expected_pco2_intercept = 8.36;
    settings.anion_gap_reference = 12;
    settings.bicarbonate_reference = 25;
    const Quantities q = derive(panel_of(worked), settings);
    EXPECT_DOUBLE_EQ(point(q, "anion_gap_corrected"), 11.5);
    EXPECT_DOUBLE_EQ(point(q, "expected_pco2"), 1.54 * 14 + 8.36);
    EXPECT_DOUBLE_EQ(point(q, "delta_ratio"), -0.5 / 11.0);
}

}  // namespace
}  // namespace steelyard::likelihoods
