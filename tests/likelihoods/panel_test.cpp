// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/panel.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <sstream>
#include <string>

#include "near.hpp"
#include "panel_of.hpp"
#include "steelyard/likelihoods/derived.hpp"
#include "steelyard/likelihoods/interval_words.hpp"

namespace steelyard::likelihoods {
namespace {

using document::Code;
using test::panel_of;

const Reading& only(const Panel& panel) {
    return panel.measured.begin()->second;
}

TEST(PanelBuilder, ReadsANumberAndAUnitHoweverTheyAreSpaced) {
    for (const char* text :
         {"2.8 mmol/L", "2.8mmol/L", "  2.8   mmol/L ", "+2.8 mEq/L", "28e-1 mmol/l", "2.80\xC2\xA0mmol/L"}) {
        const Panel panel = panel_of({{"serum_potassium", text}});
        ASSERT_EQ(panel.measured.size(), 1U) << text;
        EXPECT_EQ(only(panel).value, Interval::point(2.8)) << text;
    }
}

TEST(PanelBuilder, KeepsTheEntryAsItWasWritten) {
    const Panel panel = panel_of({{"serum_creatinine", "<= 1.10mg/dl"}});
    EXPECT_EQ(only(panel).as_read, "<= 1.10");
    EXPECT_EQ(only(panel).unit_as_read, "mg/dl");
    EXPECT_EQ(only(panel).where, (document::SourcePosition{"case.yaml", 2, 3}));
}

TEST(PanelBuilder, MakesUnitsCanonical) {
    // 0.84 mg/dL of creatinine of 113.12 g/mol is 74.257 umol/L; 5.3 kPa is 39.753 mmHg; 14 mg/dL of urea
    // nitrogen is 4.9975 mmol/L of urea; 14 mg/dL of urea is 2.3312: by hand.
    EXPECT_TRUE(test::near_abs(74.257, only(panel_of({{"serum_creatinine", "0.84 mg/dL"}})).value.low, 5e-4));
    EXPECT_TRUE(test::near_abs(39.753, only(panel_of({{"arterial_pco2", "5.3 kPa"}})).value.low, 5e-4));
    EXPECT_TRUE(
        test::near_abs(4.9975, only(panel_of({{"serum_urea_nitrogen", "14 mg/dL"}})).value.low, 5e-5));
    EXPECT_TRUE(test::near_abs(2.3312, only(panel_of({{"serum_urea", "14 mg/dL"}})).value.low, 5e-5));
    EXPECT_EQ(panel_of({{"urine_urea_nitrogen", "310 mg/dL"}}).measured.count("urine_urea"), 1U);
}

TEST(PanelBuilder, TakesALimitAsTheIntervalToTheEndOfThePlausibleRange) {
    // The other end is a floor or a ceiling, not a measurement.
    const auto up_to = [](double low, double high, bool open) {
        return Interval{low, high, false, open, true, false};
    };
    const auto from = [](double low, double high, bool open) {
        return Interval{low, high, open, false, false, true};
    };
    EXPECT_EQ(only(panel_of({{"urine_sodium", "<10 mmol/L"}})).value, up_to(0.0, 10.0, true));
    EXPECT_EQ(only(panel_of({{"urine_sodium", "<= 10 mmol/L"}})).value, up_to(0.0, 10.0, false));
    EXPECT_EQ(only(panel_of({{"serum_potassium", "> 8 mmol/L"}})).value, from(8.0, 12.0, true));
    EXPECT_EQ(only(panel_of({{"serum_potassium", ">=8mmol/L"}})).value, from(8.0, 12.0, false));
    EXPECT_EQ(only(panel_of({{"serum_potassium", "\xE2\x89\xA5 8 mmol/L"}})).value, from(8.0, 12.0, false));
    EXPECT_EQ(only(panel_of({{"urine_ph", "<5"}})).value, up_to(4.0, 5.0, true));
    EXPECT_EQ(only(panel_of({{"urine_calcium", "<=0 mmol/L"}})).value, Interval::point(0.0));
}

TEST(IntervalWords, ReadALimitAsTheLaboratoryWroteIt) {
    const auto words = [](const char* text) {
        return interval_in_words(only(panel_of({{"serum_potassium", text}})).value, 6);
    };
    EXPECT_EQ(words("2.8 mmol/L"), "2.8");
    EXPECT_EQ(words("<5 mmol/L"), "below 5");
    EXPECT_EQ(words("<=5 mmol/L"), "at most 5");
    EXPECT_EQ(words(">5 mmol/L"), "above 5");
    EXPECT_EQ(words(">=5 mmol/L"), "5 or more");
}

TEST(IntervalWords, ShowBothEndsOnlyWhenBothWereMeasured) {
    EXPECT_EQ(interval_in_words(Interval{3, 5}, 3), "3 to 5");
    EXPECT_EQ(interval_in_words(Interval{3, 5, true, true}, 3), "3 to 5");
    EXPECT_EQ(interval_in_words(Interval{3, 5, false, false, true, true}, 3), "not known");
    EXPECT_EQ(interval_in_words(Interval::point(1234.5), 3), "1234");
    EXPECT_EQ(interval_in_words(Interval::point(-0.0), 3), "0");
    const auto tenths = [](double value) { return std::to_string(static_cast<int>(value * 10)) + "/10"; };
    EXPECT_EQ(interval_in_words(Interval{0, 5, false, true, true, false}, tenths, " mmol/L"),
              "below 50/10 mmol/L");
}

TEST(PanelBuilder, LetsOnlyPHAndPlainRatiosGoWithoutAUnit) {
    for (const char* text : {"7.28", "7.28 [pH]", "7.28 pH", "7.28 1", "7.28 {pH}"}) {
        EXPECT_EQ(only(panel_of({{"arterial_ph", text}})).value, Interval::point(7.28)) << text;
    }
    EXPECT_EQ(panel_of({{"ttkg", "3.2"}}).given.at("ttkg").value, Interval::point(3.2));
}

TEST(PanelBuilder, ReadsAgeInUcumYearsAndInWords) {
    for (const char* text : {"47 a", "47 y", "47 years", "47a", "47 yr", "564 mo"}) {
        EXPECT_EQ(panel_of({{"age", text}}).age, 47.0) << text;
    }
}

TEST(PanelBuilder, ReadsEverythingElseACaseMaySay) {
    const Panel panel = panel_of({{"sex", "female"},
                                  {"urine_method", "dipstick"},
                                  {"final_cause", "classic_distal"},
                                  {"gfr", "82 mL/min/{1.73_m2}"},
                                  {"anion_gap", "11 mEq/L"},
                                  {"volume_status", "not_depleted"}});
    EXPECT_EQ(panel.case_id, "case");
    EXPECT_EQ(panel.sex, Sex::female);
    EXPECT_EQ(panel.urine_ph_method, "dipstick");
    EXPECT_EQ(panel.final_cause, "classic_distal");
    EXPECT_EQ(panel.given.at("gfr").value, Interval::point(82));
    EXPECT_EQ(panel.given.at("anion_gap").value, Interval::point(11));
    EXPECT_EQ(panel.observed.at("volume_status").level, "not_depleted");
    EXPECT_EQ(panel_of({{"sex", "male"}}).sex, Sex::male);
    EXPECT_EQ(panel_of({{"sex", "unknown"}}).sex, Sex::unknown);
}

struct BadEntry {
    const char* name;
    const char* text;
    Code code;
    const char* words;  ///< what the message or the hint must say
};

void PrintTo(const BadEntry& bad, std::ostream* out) {
    *out << bad.name << ": " << bad.text;
}

class BadEntries : public ::testing::TestWithParam<BadEntry> {};

TEST_P(BadEntries, GiveOneFaultAtTheirPlaceAndLeaveNothingBehind) {
    const BadEntry& bad = GetParam();
    document::Diagnostics faults;
    PanelBuilder builder(test::vocabulary(), faults);
    builder.start("case", {"f", 1, 1});
    builder.set(bad.name, bad.text, {"f", 7, 9});
    const Panel panel = builder.finish();
    const auto found = faults.sorted();
    ASSERT_EQ(found.size(), 1U) << bad.name << ": " << bad.text;
    EXPECT_EQ(document::to_string(found[0].code), document::to_string(bad.code)) << found[0].message;
    EXPECT_EQ(found[0].where, (document::SourcePosition{"f", 7, 9}));
    EXPECT_NE((found[0].message + "\n" + found[0].hint).find(bad.words), std::string::npos)
        << found[0].message << "\n"
        << found[0].hint;
    EXPECT_TRUE(panel.measured.empty() && panel.given.empty() && panel.observed.empty() && !panel.age &&
                !panel.final_cause && panel.urine_ph_method.empty() && panel.sex == Sex::unknown);
}

INSTANTIATE_TEST_SUITE_P(
    Numbers, BadEntries,
    ::testing::Values(BadEntry{"serum_potassium", "2,8 mmol/L", Code::not_a_number, "2.8"},
                      BadEntry{"serum_sodium", "1,390 mmol/L", Code::not_a_number, "point"},
                      BadEntry{"serum_potassium", "low", Code::not_a_number, "number"},
                      BadEntry{"serum_potassium", "mmol/L", Code::not_a_number, "number"},
                      BadEntry{"serum_potassium", "<", Code::not_a_number, "number"},
                      BadEntry{"serum_potassium", "<mmol/L", Code::not_a_number, "number"},
                      BadEntry{"serum_potassium", "2.5-3.0 mmol/L", Code::not_a_number, "one number"},
                      BadEntry{"serum_potassium", "2.8.1 mmol/L", Code::not_a_number, "one number"},
                      BadEntry{"serum_potassium", "2 8 mmol/L", Code::not_a_number, "one number"},
                      BadEntry{"serum_potassium", "0x2 mmol/L", Code::bad_unit, "x2"},
                      BadEntry{"serum_potassium", "--2 mmol/L", Code::not_a_number, "number"},
                      BadEntry{"serum_potassium", ". mmol/L", Code::not_a_number, "number"},
                      BadEntry{"serum_potassium", "nan", Code::not_finite, "finite"},
                      BadEntry{"serum_potassium", ".inf mmol/L", Code::not_finite, "finite"},
                      BadEntry{"serum_potassium", "-Infinity mmol/L", Code::not_finite, "finite"},
                      BadEntry{"serum_potassium", "1e999 mmol/L", Code::not_finite, "too large"},
                      BadEntry{"urine_sodium", "1e-400 mmol/L", Code::not_finite, "too small"},
                      BadEntry{"serum_potassium", "", Code::empty_value, "empty"},
                      BadEntry{"glycosuria", "  ", Code::empty_value, "empty"}));

INSTANTIATE_TEST_SUITE_P(
    Units, BadEntries,
    ::testing::Values(BadEntry{"serum_potassium", "2.8", Code::bad_unit, "mmol/L"},
                      BadEntry{"serum_potassium", "2.8 mg/dL", Code::bad_unit, "meq/L"},
                      BadEntry{"serum_potassium", "2.8 bananas", Code::bad_unit, "not a known unit"},
                      BadEntry{"serum_osmolality", "288 mOsm/L", Code::bad_unit, "osmolarity"},
                      BadEntry{"urine_calcium", "0.5 mmol/mmol{creat}", Code::bad_unit, "ratio"},
                      BadEntry{"urine_calcium", "120 mg/g{creat}", Code::bad_unit, "ratio"},
                      BadEntry{"urine_sodium", "60 mmol/d", Code::bad_unit, "per time"},
                      BadEntry{"urine_ammonium", "40 mmol/L", Code::bad_unit, "mmol/d"},
                      BadEntry{"serum_calcium", "4.6 meq/L", Code::bad_unit, "mg/dL"},
                      BadEntry{"gfr", "82 mL/min", Code::bad_unit, "body surface"},
                      BadEntry{"gfr", "82", Code::bad_unit, "1.73"},
                      BadEntry{"fe_sodium", "1.5", Code::bad_unit, "%"},
                      BadEntry{"age", "47", Code::bad_unit, "a"},
                      BadEntry{"age", "47 kg", Code::bad_unit, "a"}));

INSTANTIATE_TEST_SUITE_P(
    Slips, BadEntries,
    ::testing::Values(
        BadEntry{"serum_potassium", "28 mmol/L", Code::implausible_value, "1 to 12 mmol/L"},
        BadEntry{"serum_potassium", "-2.8 mmol/L", Code::implausible_value, "-2.8"},
        BadEntry{"serum_creatinine", "74 mg/dL", Code::implausible_value, "(6542 umol/L)"},
        BadEntry{"serum_creatinine", "74 mg/dL", Code::implausible_value, "74 would be plausible in umol/L"},
        BadEntry{"serum_creatinine", "0.84 umol/L", Code::implausible_value,
                 "0.84 would be plausible in mmol/L or mg/dL"},
        BadEntry{"serum_glucose", "90 mmol/L", Code::implausible_value, "90 would be plausible in mg/dL"},
        BadEntry{"serum_calcium", "9.2 mmol/L", Code::implausible_value, "9.2 would be plausible in mg/dL"},
        BadEntry{"serum_albumin", "3.8 g/L", Code::implausible_value, "3.8 would be plausible in g/dL"},
        BadEntry{"arterial_pco2", "5.3 mmHg", Code::implausible_value, "5.3 would be plausible in kPa"},
        BadEntry{"arterial_pco2", "40 kPa", Code::implausible_value, "40 would be plausible in mm[Hg]"},
        BadEntry{"urine_creatinine", "5304 mmol/L", Code::implausible_value,
                 "5304 would be plausible in umol/L"},
        BadEntry{"urine_citrate", "320 mmol/d", Code::implausible_value,
                 "320 would be plausible in umol/d, mg/d"},
        BadEntry{"urine_ph", "72", Code::implausible_value, "4 to 9.5"},
        BadEntry{"age", "470 a", Code::implausible_value, "130"},
        BadEntry{"serum_potassium", "<0.5 mmol/L", Code::bad_limit, "range"},
        BadEntry{"serum_potassium", ">12 mmol/L", Code::bad_limit, "range"},
        BadEntry{"serum_potassium", ">20 mmol/L", Code::bad_limit, "range"},
        BadEntry{"serum_potassium", "<28 mmol/L", Code::bad_limit, "range"},
        BadEntry{"urine_sodium", "<0 mmol/L", Code::bad_limit, "range"},
        BadEntry{"age", ">89 a", Code::bad_limit, "one number"}));

INSTANTIATE_TEST_SUITE_P(
    Names, BadEntries,
    ::testing::Values(BadEntry{"serum_potasium", "2.8 mmol/L", Code::unknown_analyte, "serum_potassium"},
                      BadEntry{"serum_urea_nitrogenn", "14 mg/dL", Code::unknown_analyte,
                               "serum_urea_nitrogen"},
                      BadEntry{"urine_ph_metod", "dipstick", Code::unknown_analyte, "urine_ph_metod"},
                      BadEntry{"gfrr", "82 mL/min/{1.73_m2}", Code::unknown_analyte, "gfr"},
                      BadEntry{"glycosurea", "present", Code::unknown_feature, "glycosuria"},
                      BadEntry{"headache", "present", Code::unknown_feature, "headache"},
                      BadEntry{"glycosuria", "yes", Code::bad_level, "present or absent"},
                      BadEntry{"volume_status", "depletd", Code::bad_level, "did you mean depleted?"},
                      BadEntry{"sex", "f", Code::bad_choice, "female, male or unknown"},
                      BadEntry{"urine_method", "strip", Code::bad_choice, "electrode or dipstick"}));

TEST(PanelBuilder, RefusesTheSameQuantityTwiceAndKeepsTheFirst) {
    const std::vector<std::pair<std::string, std::string>> pairs{{"serum_potassium", "serum_potassium"},
                                                                 {"serum_urea", "serum_urea_nitrogen"},
                                                                 {"serum_urea_nitrogen", "serum_urea"}};
    for (const auto& [first, second] : pairs) {
        document::Diagnostics faults;
        PanelBuilder builder(test::vocabulary(), faults);
        builder.start("case", {"f", 1, 1});
        builder.set(first, "5 mmol/L", {"f", 2, 1});
        builder.set(second, "6 mmol/L", {"f", 3, 1});
        ASSERT_EQ(faults.size(), 1U) << first;
        const document::Diagnostic fault = faults.sorted().front();
        EXPECT_EQ(fault.code, Code::conflicting_values);
        EXPECT_EQ(fault.where.line, 3);
        EXPECT_NE(fault.message.find("f:2:1"), std::string::npos) << fault.message;
        EXPECT_EQ(only(builder.finish()).value, Interval::point(5.0));
    }
    for (const char* name : {"age", "sex", "glycosuria", "gfr"}) {
        document::Diagnostics faults;
        PanelBuilder builder(test::vocabulary(), faults);
        builder.start("case", {"f", 1, 1});
        builder.set(name, "x", {"f", 2, 1});
        builder.set(name, "x", {"f", 3, 1});
        EXPECT_EQ(faults.sorted().back().code, Code::conflicting_values) << name;
    }
}

TEST(PanelBuilder, ForgetsTheCaseBefore) {
    document::Diagnostics faults;
    PanelBuilder builder(test::vocabulary(), faults);
    builder.start("one", {"f", 1, 1});
    builder.set("serum_potassium", "2.8 mmol/L", {"f", 1, 1});
    EXPECT_EQ(builder.finish().case_id, "one");
    builder.start("two", {"f", 2, 1});
    builder.set("serum_potassium", "3.8 mmol/L", {"f", 2, 1});
    EXPECT_TRUE(faults.empty());
    EXPECT_EQ(only(builder.finish()).value, Interval::point(3.8));
}

TEST(PanelBuilder, TakesTheUnitApartAsWell) {
    document::Diagnostics faults;
    PanelBuilder builder(test::vocabulary(), faults);
    builder.start("case", {"f", 1, 1});
    builder.set("serum_potassium", "<3", "mmol/L", {"f", 1, 1});
    builder.set("arterial_ph", "7.28", "", {"f", 1, 2});
    builder.set("serum_sodium", "139 mmol/L", "", {"f", 1, 3});
    builder.set("glycosuria", "present", "", {"f", 1, 4});
    EXPECT_TRUE(faults.empty());
    builder.set("serum_chloride", "115 mmol/L", "mmol/L", {"f", 1, 5});
    builder.set("volume_status", "depleted", "mmol/L", {"f", 1, 6});
    ASSERT_EQ(faults.size(), 2U);
    EXPECT_EQ(faults.sorted()[0].code, Code::bad_unit);
    EXPECT_EQ(faults.sorted()[1].code, Code::bad_unit);
    const Panel panel = builder.finish();
    EXPECT_EQ(panel.measured.size(), 3U);
    EXPECT_EQ(panel.measured.at("serum_potassium").value, (Interval{1.0, 3.0, false, true, true, false}));
}

TEST(PanelBuilder, ReadsEveryQuantityInEveryAcceptedUnit) {
    for (const auto& analyte : analytes()) {
        const Unit canonical = *read_unit(analyte.unit).unit;
        const double middle = 0.5 * (analyte.plausible_low + analyte.plausible_high);
        for (const Unit& unit : accepted_units(canonical, analyte.substance)) {
            const double factor = *conversion_factor(unit, canonical, analyte.substance);
            std::ostringstream text;
            text.precision(17);
            text << middle / factor << " " << unit.ucum;
            const Panel panel = panel_of({{std::string(analyte.id), text.str()}});
            ASSERT_EQ(panel.measured.size(), 1U) << analyte.id << " " << text.str();
            EXPECT_TRUE(test::near_rel(middle, only(panel).value.low, 1e-14))
                << analyte.id << " " << unit.ucum;
        }
    }
}

TEST(PanelBuilder, NeverThrowsAndAlwaysHasAWordForWhatItRefuses) {
    EXPECT_TRUE(rc::check("any bytes give a value or a fault", [] {
        const auto text = *rc::gen::container<std::string>(
            rc::gen::elementOf(std::string("0123456789.,-+<>=eE /mlLo[pH]%1\xC2\xB5\xE2\x89\xA4 nainf")));
        document::Diagnostics faults;
        PanelBuilder builder(test::vocabulary(), faults);
        builder.start("case", {"f", 1, 1});
        builder.set("serum_potassium", text, {"f", 1, 1});
        const Panel panel = builder.finish();
        RC_ASSERT(panel.measured.size() + faults.size() == 1U);
        if (!panel.measured.empty()) {
            const Interval& value = only(panel).value;
            RC_ASSERT(1.0 <= value.low && value.low <= value.high && value.high <= 12.0);
        }
    }));
}

}  // namespace
}  // namespace steelyard::likelihoods
