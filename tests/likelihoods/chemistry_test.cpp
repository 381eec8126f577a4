// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/chemistry.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>
#include <string>

#include "near.hpp"
#include "reference_table.hpp"
#include "steelyard/likelihoods/unit.hpp"

namespace steelyard::likelihoods::chemistry {
namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

TEST(Chemistry, ReproducesEveryPublishedAndComputedCheckValue) {
    const test::ReferenceTable table("chemistry.csv");
    const auto check = [&](const char* which, const char* quantity, double got) {
        EXPECT_TRUE(table.matches(which, quantity, got));
    };
    check("case31", "anion_gap", anion_gap(143, 120, 12.5));
    check("case31", "delta_ratio", delta_ratio(10.5, 12.5, 12, 24));
    check("case31", "ph", ph_from_gas(12.5, 31));
    check("case31", "urine_anion_gap", urine_anion_gap(70, 25, 65));
    check("normal", "ph", ph_from_gas(24, 40));
    check(
        "citrate", "mmol",
        320 * *conversion_factor(*read_unit("mg/d").unit, *read_unit("mmol/d").unit, Substance{192.123, 0}));
    check("albumin21", "reference40", anion_gap_corrected(10.5, 21, 0.25, 40));
    check("albumin21", "reference44", anion_gap_corrected(10.5, 21, 0.25, 44));
    check("gap20", "delta_ratio", delta_ratio(20, 16, 12, 24));
    check("worked", "anion_gap_corrected", anion_gap_corrected(anion_gap(139, 115, 14), 38, 0.25, 40));
    check("worked", "delta_ratio", delta_ratio(10.5, 14, 10, 24));
    check("winters_15", "fine", expected_pco2(15, 1.54, 8.36));
    check("winters_15", "rounded", expected_pco2(15, 1.5, 8));
    check("winters_12.5", "fine", expected_pco2(12.5, 1.54, 8.36));
    check("winters_12.5", "rounded", expected_pco2(12.5, 1.5, 8));
    check("hh_24_40", "ph", ph_from_gas(24, 40));
    check("hh_12.5_31", "ph", ph_from_gas(12.5, 31));
    check("hh_7.20_31", "bicarbonate", bicarbonate_from_gas(7.20, 31));
    check("henderson", "hydrogen_ion", hydrogen_ion(12.5, 31));
    check("uag", "negative", urine_anion_gap(40, 20, 80));
    check("goldstein_-20", "ammonium", ammonium_from_anion_gap(-20));
    check("goldstein_0", "ammonium", ammonium_from_anion_gap(0));
    check("goldstein_30", "ammonium", ammonium_from_anion_gap(30));
    check("uog", "gap", urine_osmolal_gap(500, 40, 30, 250, 0));
    check("uog", "ammonium", ammonium_from_osmolal_gap(urine_osmolal_gap(500, 40, 30, 250, 0)));
    check("uog", "with_glucose", urine_osmolal_gap(550, 40, 30, 250, 50));
    check("uog", "glucose_left_out", urine_osmolal_gap(550, 40, 30, 250, 0));
    check("fe", "sodium", fractional_excretion(40, 140, 5304, 88.42));
    check("fe", "bicarbonate", fractional_excretion(120, 25, 24, 1.0));
    check("fe", "potassium", fractional_excretion(40, 6.0, 80, 2.0));
    check("fe", "urate", fractional_excretion(30, 3.0, 80, 1.0));
    check("urine_bicarbonate", "alkaline", urine_bicarbonate(7.5, 60, 100, 50));
    check("urine_bicarbonate", "acid", urine_bicarbonate(6.0, 45, 60, 40));
    check("ttkg", "high_potassium", ttkg(40, 6.0, 600, 290));
    check("ttkg", "low_potassium", ttkg(20, 3.0, 400, 285));
    check("tmp_low", "trp", phosphate_reabsorption(20, 0.70, 6.0, 0.08));
    check("tmp_low", "tmp_gfr", tmp_gfr(20, 0.70, 6.0, 0.08));
    check("tmp_high", "trp", phosphate_reabsorption(15, 1.00, 10.0, 0.07));
    check("tmp_high", "tmp_gfr", tmp_gfr(15, 1.00, 10.0, 0.07));
    check("gfr_0.60_30_F", "gfr", ckd_epi_2021(0.60, 30, true));
    check("gfr_0.80_50_F", "gfr", ckd_epi_2021(0.80, 50, true));
    check("gfr_3.00_70_F", "gfr", ckd_epi_2021(3.00, 70, true));
    check("gfr_0.80_30_M", "gfr", ckd_epi_2021(0.80, 30, false));
    check("gfr_0.90_50_M", "gfr", ckd_epi_2021(0.90, 50, false));
    check("gfr_1.00_40_M", "gfr", ckd_epi_2021(1.00, 40, false));
    check("gfr_2.00_55_M", "gfr", ckd_epi_2021(2.00, 55, false));
    check("gfr_4.00_55_M", "gfr", ckd_epi_2021(4.00, 55, false));
    check("katz", "slope1.6", sodium_corrected(130, 6 * 5.55));
    check("katz", "slope2.4", sodium_corrected(130, 6 * 5.55, 2.4));
    check("katz", "two_slopes", sodium_corrected_two_slopes(130, 6 * 5.55));
    check("osmolality", "calculated", serum_osmolality(140, 5, 5));
    check("cl_na", "high", ratio(120, 143));
    check("cl_na", "normal", ratio(104, 140));
    EXPECT_TRUE(table.unused().empty()) << table.unused().front();
}

// The conventional form divides by rounded factors, 2.8 and 18; ours converts exactly. 700 mg/dL of nitrogen
// is then 249.9 and not 250 mmol/L, 900 mg/dL of glucose 49.96 and not 50: the gap moves by less than 0.2.
// Computed by hand.
TEST(UrineOsmolalGap, AgreesWithTheConventionalFormWithinItsRoundedFactors) {
    const Unit mg_dl = *read_unit("mg/dL").unit;
    const Unit mmol = *read_unit("mmol/L").unit;
    const double urea = 700 * *conversion_factor(mg_dl, mmol, Substance{28.014, 0});
    const double glucose = 900 * *conversion_factor(mg_dl, mmol, Substance{180.156, 0});
    EXPECT_TRUE(test::near_abs(110, urine_osmolal_gap(500, 40, 30, urea, 0), 0.2));
    EXPECT_TRUE(test::near_abs(110, urine_osmolal_gap(550, 40, 30, urea, glucose), 0.2));
}

TEST(HendersonHasselbalch, IsItsOwnInverse) {
    EXPECT_TRUE(rc::check("pH from the bicarbonate of a pH is that pH", [] {
        const double ph = *rc::gen::inRange(6500, 7900) / 1000.0;
        const double pco2 = *rc::gen::inRange(80, 2000) / 10.0;
        RC_ASSERT(std::abs(ph_from_gas(bicarbonate_from_gas(ph, pco2), pco2) - ph) < 1e-12);
    }));
}

// The Henderson form rounds 24 (with a = 0.0307 it is 25.9): the two differ by about 0.03 in pH. Computed by
// hand: -log10(59.52e-9) = 7.2253 against 7.2184.
TEST(HydrogenIon, AgreesWithTheLogarithmicFormWithinTheRoundingOfItsConstant) {
    const double ph = 9.0 - std::log10(hydrogen_ion(12.5, 31));
    EXPECT_TRUE(test::near_abs(7.225, ph, 0.0005));
    EXPECT_TRUE(test::near_abs(ph_from_gas(12.5, 31), ph, 0.03));
}

TEST(CkdEpi, FallsWithCreatinineAndAge) {
    EXPECT_TRUE(rc::check("more creatinine or more years, less filtration", [] {
        const double creatinine = *rc::gen::inRange(20, 2000) / 100.0;
        const double more = creatinine + *rc::gen::inRange(1, 500) / 100.0;
        const double age = *rc::gen::inRange(18, 100);
        const bool female = *rc::gen::arbitrary<bool>();
        RC_ASSERT(ckd_epi_2021(more, age, female) < ckd_epi_2021(creatinine, age, female));
        RC_ASSERT(ckd_epi_2021(creatinine, age + 1, female) < ckd_epi_2021(creatinine, age, female));
    }));
}

TEST(CkdEpi, IsContinuousAtItsKnot) {
    for (const bool female : {false, true}) {
        const double knot = female ? 0.7 : 0.9;
        EXPECT_TRUE(test::near_rel(ckd_epi_2021(knot, 40, female),
                                   ckd_epi_2021(knot * (1 + 1e-12), 40, female), 1e-10));
    }
}

// The published algorithm steps down from 0.86 to 0.3 x 0.86 / 0.312 = 0.82692 of phosphate: by hand.
TEST(TmpGfr, StepsDownByFourPercentWhereReabsorptionPassesItsLimit) {
    EXPECT_DOUBLE_EQ(tmp_gfr_per_phosphate(0.86), 0.86);
    EXPECT_TRUE(test::near_abs(0.258 / 0.312, tmp_gfr_per_phosphate(0.86 + 1e-12), 1e-10));
    EXPECT_DOUBLE_EQ(tmp_gfr_per_phosphate(1.0), 1.5);
}

TEST(TwoSlopes, ContinuesTheFirstSlopeAndIsSteeperBeyondIt) {
    EXPECT_DOUBLE_EQ(sodium_corrected_two_slopes(130, 22.2), sodium_corrected(130, 22.2));
    EXPECT_GT(sodium_corrected_two_slopes(130, 22.3) - sodium_corrected_two_slopes(130, 22.2),
              sodium_corrected(130, 22.3) - sodium_corrected(130, 22.2));
    EXPECT_DOUBLE_EQ(sodium_corrected(140, 4.0), 140.0);  // no correction without hyperglycaemia
}

TEST(Chemistry, HasNoValueOutsideItsDomain) {
    EXPECT_TRUE(std::isnan(delta_ratio(12, 24, 10, 24)));
    EXPECT_TRUE(std::isnan(delta_ratio(12, 30, 10, 24)));
    EXPECT_TRUE(std::isnan(ph_from_gas(0, 40)));
    EXPECT_TRUE(std::isnan(ph_from_gas(24, 0)));
    EXPECT_TRUE(std::isnan(bicarbonate_from_gas(7.4, -1)));
    EXPECT_TRUE(std::isnan(hydrogen_ion(0, 40)));
    EXPECT_TRUE(std::isnan(fractional_excretion(40, 0, 10, 0.1)));
    EXPECT_TRUE(std::isnan(fractional_excretion(40, 140, 0, 0.1)));
    EXPECT_TRUE(std::isnan(urine_bicarbonate(7.5, 0, 100, 50)));
    EXPECT_TRUE(std::isnan(ttkg(40, 0, 600, 290)));
    EXPECT_TRUE(std::isnan(ttkg(40, 4, 0, 290)));
    EXPECT_TRUE(std::isnan(tmp_gfr_per_phosphate(-0.1)));
    EXPECT_TRUE(std::isnan(tmp_gfr_per_phosphate(1.1)));
    EXPECT_TRUE(std::isnan(ckd_epi_2021(1.0, 17.9, true)));
    EXPECT_TRUE(std::isnan(ckd_epi_2021(0.0, 40, true)));
    EXPECT_TRUE(std::isnan(ratio(1, 0)));
}

TEST(Chemistry, PassesNaNOn) {
    EXPECT_TRUE(std::isnan(anion_gap(nan, 110, 14)));
    EXPECT_TRUE(std::isnan(delta_ratio(12, nan, 10, 24)));
    EXPECT_TRUE(std::isnan(ckd_epi_2021(nan, 40, true)));
    EXPECT_TRUE(std::isnan(ckd_epi_2021(1.0, nan, true)));
    EXPECT_TRUE(std::isnan(tmp_gfr_per_phosphate(nan)));
    EXPECT_TRUE(std::isnan(urine_bicarbonate(7, 40, nan, 1)));
}

}  // namespace
}  // namespace steelyard::likelihoods::chemistry
