// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/analyte.hpp"

#include <gtest/gtest.h>

#include <set>
#include <string>

#include "near.hpp"
#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods {
namespace {

// Standard atomic weights, IUPAC abridged values.
constexpr double H = 1.008, C = 12.011, N = 14.007, O = 15.999, P = 30.974, Mg = 24.305, Ca = 40.078;

double molar_mass(std::string_view id) {
    return find_analyte(id)->substance.molar_mass;
}

TEST(Analytes, HaveMolarMassesThatFollowFromTheirFormulas) {
    EXPECT_TRUE(test::near_rel(4 * C + 7 * H + 3 * N + O, molar_mass("serum_creatinine"), 1e-9));
    EXPECT_TRUE(test::near_rel(C + 4 * H + 2 * N + O, molar_mass("serum_urea"), 1e-9));
    EXPECT_TRUE(test::near_rel(6 * C + 12 * H + 6 * O, molar_mass("serum_glucose"), 1e-9));
    EXPECT_TRUE(test::near_rel(P, molar_mass("serum_phosphate"), 1e-9));
    EXPECT_TRUE(test::near_rel(Ca, molar_mass("serum_calcium"), 1e-9));
    EXPECT_TRUE(test::near_rel(Mg, molar_mass("serum_magnesium"), 1e-9));
    EXPECT_TRUE(test::near_rel(3 * C + 6 * H + 3 * O, molar_mass("serum_lactate"), 1e-9));
    EXPECT_TRUE(test::near_rel(4 * C + 8 * H + 3 * O, molar_mass("serum_beta_hydroxybutyrate"), 1e-9));
    EXPECT_TRUE(test::near_rel(5 * C + 4 * H + 4 * N + 3 * O, molar_mass("serum_urate"), 1e-9));
    EXPECT_TRUE(test::near_rel(21 * C + 28 * H + 5 * O, molar_mass("serum_aldosterone"), 1e-9));
    EXPECT_TRUE(test::near_rel(6 * C + 8 * H + 7 * O, molar_mass("urine_citrate"), 1e-9));
    ASSERT_EQ(entry_aliases().size(), 2U);
    for (const EntryAlias& alias : entry_aliases()) {
        EXPECT_TRUE(test::near_rel(2 * N, alias.substance.molar_mass, 1e-9)) << alias.name;
    }
}

TEST(Analytes, HaveOneUnitOfTheSameKindInSerumAndUrineOfASubstance) {
    for (const Analyte& analyte : analytes()) {
        const std::string id(analyte.id);
        if (!id.starts_with("serum_")) {
            continue;
        }
        if (const Analyte* urine = find_analyte("urine_" + id.substr(6))) {
            EXPECT_EQ(analyte.substance.molar_mass, urine->substance.molar_mass) << id;
            EXPECT_EQ(analyte.substance.charge, urine->substance.charge) << id;
            EXPECT_EQ(read_unit(analyte.unit).unit->dimension, read_unit(urine->unit).unit->dimension) << id;
        }
    }
}

TEST(Analytes, HaveDistinctIdsKnownUnitsAndProperRanges) {
    std::set<std::string_view> ids;
    for (const Analyte& analyte : analytes()) {
        EXPECT_TRUE(ids.insert(analyte.id).second) << analyte.id;
        ASSERT_TRUE(read_unit(analyte.unit).unit) << analyte.id;
        EXPECT_EQ(read_unit(analyte.unit).unit->ucum, analyte.unit);
        EXPECT_LT(analyte.plausible_low, analyte.plausible_high) << analyte.id;
        EXPECT_GE(analyte.plausible_low, 0.0) << analyte.id;
        EXPECT_EQ(find_analyte(analyte.id), &analyte);
        EXPECT_EQ(analyte.unit_may_be_omitted, analyte.unit == "[pH]") << analyte.id;
    }
    EXPECT_EQ(find_analyte("serum_unobtainium"), nullptr);
    EXPECT_EQ(ids.size(), 42U);
}

// What laboratories telephone about must never be refused as a slip. Widest published limits for adults:
// means of a US survey, JAMA 1990;263:704-707; later US surveys; outcome-based thresholds from an intensive
// care database; posted lists.
TEST(Analytes, TakeTheWidestPublishedCriticalValuesForPatients) {
    struct Critical {
        const char* id;
        double low, high;
    };
    for (const Critical& critical : {Critical{"serum_potassium", 2.2, 8.0},
                                     {"arterial_ph", 7.00, 7.60},
                                     {"serum_bicarbonate", 5.0, 50.0},
                                     {"arterial_pco2", 19.0, 67.0},
                                     {"serum_sodium", 120.0, 158.0},
                                     {"serum_chloride", 80.0, 125.0},
                                     {"serum_glucose", 1.5, 26.9},
                                     {"serum_lactate", 5.0, 7.0},
                                     {"serum_phosphate", 0.19, 2.87}}) {
        const Analyte* analyte = find_analyte(critical.id);
        EXPECT_LT(analyte->plausible_low, critical.low) << critical.id;
        EXPECT_GT(analyte->plausible_high, critical.high) << critical.id;
    }
}

TEST(FindQuantity, KnowsAnalytesAndDerivedQuantities) {
    ASSERT_NE(find_quantity("serum_albumin"), nullptr);
    EXPECT_EQ(find_quantity("serum_albumin")->unit, "g/L");
    ASSERT_NE(find_quantity("gfr"), nullptr);
    EXPECT_EQ(find_quantity("gfr")->unit, "mL/min/{1.73_m2}");
    EXPECT_EQ(find_quantity("gfr")->title, "GFR");
    EXPECT_EQ(find_quantity("nephrocalcinosis"), nullptr);
    EXPECT_EQ(find_quantity(""), nullptr);
}

}  // namespace
}  // namespace steelyard::likelihoods
