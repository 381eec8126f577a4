// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/unit.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <set>
#include <string>
#include <vector>

#include "csv_rows.hpp"
#include "near.hpp"

namespace steelyard::likelihoods {
namespace {

/// Half a unit in the last printed digit of a decimal text.
double half_last_digit(const std::string& printed) {
    const std::size_t point = printed.find('.');
    const double decimals =
        point == std::string::npos ? 0.0 : static_cast<double>(printed.size() - point - 1);
    return point == std::string::npos ? 0.0 : 0.5 * std::pow(10.0, -decimals);
}

Substance substance_of(const test::CsvRow& row) {
    Substance substance;
    if (const std::string& mass = row.at("molar_mass_g_mol"); !mass.empty()) {
        substance.molar_mass = std::stod(mass);
    }
    const std::string& how = row.at("how");
    if (const std::size_t at = how.find("charge "); at != std::string::npos) {
        substance.charge = std::stoi(how.substr(at + 7));
    }
    return substance;
}

TEST(UnitConversion, ReproducesEveryRowOfTheUcumChecks) {
    const auto rows = test::read_csv_rows("ucum_checks.csv");
    ASSERT_EQ(rows.size(), 38U);
    for (const test::CsvRow& row : rows) {
        SCOPED_TRACE(row.at("analyte") + " " + row.at("from") + " to " + row.at("to"));
        const UnitReading from = read_unit(row.at("from"));
        const UnitReading to = read_unit(row.at("to"));
        ASSERT_TRUE(from.unit && to.unit);
        const auto factor = conversion_factor(*from.unit, *to.unit, substance_of(row));
        ASSERT_TRUE(factor);
        // 1e-12, beyond the rounding of the printed figure itself.
        const double want = std::stod(row.at("factor"));
        EXPECT_TRUE(test::near_abs(want, *factor, 1e-12 * want + half_last_digit(row.at("factor"))));
        const double out = std::stod(row.at("value_out"));
        EXPECT_TRUE(test::near_abs(out, std::stod(row.at("value_in")) * *factor,
                                   1e-12 * out + half_last_digit(row.at("value_out"))));
    }
}

TEST(ReadUnit, ReadsEverySpellingAsItsRowSays) {
    const auto rows = test::read_csv_rows("unit_strings.csv");
    ASSERT_EQ(rows.size(), 44U);
    const Unit mmol = *read_unit("mmol/L").unit;
    for (const test::CsvRow& row : rows) {
        SCOPED_TRACE(row.at("text") + ": " + row.at("action"));
        const UnitReading reading = read_unit(row.at("text"));
        const std::string& canonical = row.at("canonical_ucum");
        if (canonical.empty() || canonical == "mosm/L" || canonical == "mL/min") {
            // Refused with words, or, as a ratio to creatinine, refused as a concentration.
            if (reading.unit) {
                EXPECT_FALSE(conversion_factor(*reading.unit, mmol, Substance{113.12, 1}));
            } else {
                EXPECT_FALSE(reading.why_not.empty());
            }
        } else {
            ASSERT_TRUE(reading.unit);
            EXPECT_EQ(reading.unit->ucum, canonical);
            EXPECT_TRUE(reading.why_not.empty());
        }
    }
}

TEST(ReadUnit, TakesPHForAcidityAndNeverForPicohenry) {
    ASSERT_TRUE(read_unit("pH").unit);
    EXPECT_EQ(read_unit("pH").unit->dimension, Dimension::ph);
}

TEST(ReadUnit, AcceptsBothLetterCasesOfTheLitreOnly) {
    EXPECT_EQ(read_unit("ml/min/{1.73_m2}").unit->ucum, "mL/min/{1.73_m2}");
    EXPECT_EQ(read_unit("\xC2\xB5mol/l").unit->ucum, "umol/L");
    EXPECT_EQ(read_unit(" mmol/l ").unit->ucum, "mmol/L");
    EXPECT_FALSE(read_unit("MMOL/L").unit);
    EXPECT_FALSE(read_unit("mmoL/L").unit);
}

TEST(ReadUnit, LeavesAnUnknownTextWithoutWords) {
    for (const char* text : {"", " ", "furlong", "mmol", "mmol/L/L", "mg/", "m[Hg]"}) {
        const UnitReading reading = read_unit(text);
        EXPECT_FALSE(reading.unit) << text;
        EXPECT_TRUE(reading.why_not.empty()) << text;
    }
}

TEST(Units, EachCodeReadsAsItself) {
    std::set<std::string_view> codes;
    for (const Unit& unit : units()) {
        EXPECT_TRUE(codes.insert(unit.ucum).second) << unit.ucum;
        const UnitReading reading = read_unit(unit.ucum);
        ASSERT_TRUE(reading.unit) << unit.ucum;
        EXPECT_EQ(*reading.unit, unit);
        EXPECT_GT(unit.to_base, 0.0);
    }
}

TEST(UnitConversion, RefusesWhatIsNotTheSameKindOfQuantity) {
    const Substance creatinine{113.12, 1};
    const auto factor = [&](const char* from, const char* to) {
        return conversion_factor(*read_unit(from).unit, *read_unit(to).unit, creatinine);
    };
    EXPECT_FALSE(factor("mmol/d", "mmol/L"));
    EXPECT_FALSE(factor("mg/d", "mg/L"));
    EXPECT_FALSE(factor("mmol/mmol{creat}", "mmol/L"));
    EXPECT_FALSE(factor("mosm/kg", "mmol/L"));
    EXPECT_FALSE(factor("%", "1"));
    EXPECT_FALSE(factor("[pH]", "mmol/L"));
    EXPECT_FALSE(factor("1", "mmol/L"));
    EXPECT_TRUE(factor("mmol/L", "mg/dL"));
}

TEST(UnitConversion, NeedsTheMolarMassForMassAndTheChargeForEquivalents) {
    const Unit mmol = *read_unit("mmol/L").unit;
    EXPECT_FALSE(conversion_factor(*read_unit("mg/dL").unit, mmol, Substance{0.0, 1}));
    EXPECT_FALSE(conversion_factor(*read_unit("meq/L").unit, mmol, Substance{180.156, 0}));
}

TEST(UnitConversion, ComesBackToTheSameValue) {
    const Substance substance{40.078, 2};
    EXPECT_TRUE(rc::check("a value converted there and back is itself", [&] {
        const double value = *rc::gen::inRange(1, 100000000) / 1000.0;
        const Unit a = *rc::gen::elementOf(std::vector<Unit>(units().begin(), units().end()));
        for (const Unit& b : units()) {
            const auto there = conversion_factor(a, b, substance);
            const auto back = conversion_factor(b, a, substance);
            // A pH may be coded as a plain number; no plain number is given as a pH. All else converts both
            // ways.
            const bool one_way = a.dimension != b.dimension &&
                                 (a.dimension == Dimension::ratio || b.dimension == Dimension::ratio);
            RC_ASSERT(one_way || there.has_value() == back.has_value());
            if (there && back) {
                // Four roundings of at most half an ulp in each factor, one in each product.
                RC_ASSERT(std::abs(value * *there * *back - value) <= 6e-15 * std::abs(value));
            }
        }
    }));
}

TEST(AcceptedUnits, BeginWithTheCanonicalUnitAndAllConvert) {
    const Unit canonical = *read_unit("umol/L").unit;
    const Substance creatinine{113.12, 0};
    const auto accepted = accepted_units(canonical, creatinine);
    ASSERT_FALSE(accepted.empty());
    EXPECT_EQ(accepted.front(), canonical);
    std::set<std::string_view> codes;
    for (const Unit& unit : accepted) {
        EXPECT_TRUE(conversion_factor(unit, canonical, creatinine)) << unit.ucum;
        codes.insert(unit.ucum);
    }
    EXPECT_TRUE(codes.contains("mg/dL"));
    EXPECT_FALSE(codes.contains("meq/L"));
}

}  // namespace
}  // namespace steelyard::likelihoods
