// SPDX-License-Identifier: Apache-2.0
// The derived quantities as the program knows them, and the look-up of any quantity. Plausible ranges of
// given values are elicited: wide, to catch a slip of unit only.

#include <algorithm>
#include <array>

#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods {
namespace {

constexpr Substance plain{0.0, 0};
constexpr Substance monovalent{0.0, 1};

constexpr auto table = std::to_array<DerivedQuantity>({
    {"anion_gap", "Anion gap", "mmol/L", "Na - Cl - HCO3", "RASTEGAR2007", -30.0, 80.0, monovalent},
    {"anion_gap_corrected", "Anion gap, corrected for albumin", "mmol/L",
     "anion gap + slope x (albumin reference - albumin), slope 0.25 mmol/g", "FIGGE1998", -30.0, 80.0,
     monovalent},
    {"delta_ratio", "Delta ratio", "1",
     "(corrected anion gap - gap reference) / (bicarbonate reference - bicarbonate)",
     "practice; RASTEGAR2007", -50.0, 50.0, plain},
    {"expected_pco2", "Expected pCO2", "mm[Hg]", "slope x HCO3 + intercept (1.5 and 8, or 1.54 and 8.36)",
     "Albert, Dell and Winters 1967; coefficients from memory", 5.0, 120.0, plain},
    {"bicarbonate_from_gas", "Bicarbonate from the blood gas", "mmol/L", "0.0307 x pCO2 x 10^(pH - 6.1)",
     "Henderson-Hasselbalch; coefficients from memory", 0.5, 100.0, monovalent},
    {"urine_bicarbonate_estimate", "Urine bicarbonate from pH and pCO2", "mmol/L",
     "0.0309 x pCO2 x 10^(pH - pK'), pK' = 6.33 - 0.5 x sqrt((Na + K) / 1000)", "memory", 0.0, 500.0,
     monovalent},
    {"urine_anion_gap", "Urine anion gap", "mmol/L", "Na + K - Cl", "GOLDSTEIN1986; BATLLE1988", -400.0,
     500.0, monovalent},
    {"urine_osmolal_gap", "Urine osmolal gap", "mosm/kg", "osmolality - (2 x (Na + K) + urea + glucose)",
     "KIM1996", -300.0, 1000.0, plain},
    {"urine_ammonium_estimate", "Urine ammonium, estimated", "mmol/L",
     "osmolal gap / 2, or else 82 - 0.8 x urine anion gap", "KIM1996; GOLDSTEIN1986", -200.0, 500.0,
     monovalent},
    {"gfr", "GFR", "mL/min/{1.73_m2}", "CKD-EPI creatinine equation of 2021, adults", "INKER2021", 1.0, 250.0,
     plain},
    {"fe_sodium", "Fractional excretion of sodium", "%", "100 x (U/P of sodium) / (U/P of creatinine)",
     "practice", 0.0, 100.0, plain},
    {"fe_potassium", "Fractional excretion of potassium", "%",
     "100 x (U/P of potassium) / (U/P of creatinine)", "practice", 0.0, 500.0, plain},
    {"fe_bicarbonate", "Fractional excretion of bicarbonate", "%",
     "100 x (U/P of bicarbonate) / (U/P of creatinine); urine bicarbonate measured, or else estimated",
     "SORIANO2002", 0.0, 150.0, plain},
    {"fe_phosphate", "Fractional excretion of phosphate", "%",
     "100 x (U/P of phosphate) / (U/P of creatinine)", "practice", 0.0, 150.0, plain},
    {"fe_urate", "Fractional excretion of urate", "%", "100 x (U/P of urate) / (U/P of creatinine)",
     "practice", 0.0, 200.0, plain},
    {"tmp_gfr", "TmP/GFR", "mmol/L",
     "phosphate x TRP where TRP <= 0.86, above it phosphate x 0.3 x TRP / (1 - 0.8 x TRP); TRP = 1 - FE "
     "phosphate",
     "PAYNE1998; formula from memory", 0.0, 8.0, plain},
    {"ttkg", "Transtubular potassium gradient", "1", "(U/P of potassium) / (U/P of osmolality)", "ETHIER1990",
     0.0, 80.0, plain},
    {"urine_potassium_creatinine", "Urine potassium to creatinine", "mmol/mmol", "K / creatinine", "practice",
     0.0, 300.0, plain},
    {"urine_calcium_creatinine", "Urine calcium to creatinine", "mmol/mmol", "Ca / creatinine", "RIBEIRO2000",
     0.0, 20.0, plain},
    {"chloride_sodium_ratio", "Serum chloride to sodium", "1", "Cl / Na", "BEREND2017", 0.3, 1.5, plain},
    {"urine_sodium_chloride_ratio", "Urine sodium to chloride", "1", "Na / Cl", "practice; WU2017", 0.0,
     500.0, plain},
    {"serum_osmolality_estimate", "Serum osmolality, calculated", "mosm/kg", "2 x Na + glucose + urea",
     "practice", 180.0, 650.0, plain},
    {"sodium_corrected", "Sodium corrected for glucose", "mmol/L",
     "Na + 1.6 x (glucose - 5.55) / 5.55, above 5.55", "KATZ1973", 90.0, 250.0, monovalent},
});

}  // namespace

std::span<const DerivedQuantity> derived_quantities() {
    return table;
}

const DerivedQuantity* find_derived(std::string_view id) noexcept {
    const auto* const found =
        std::find_if(table.begin(), table.end(), [&](const DerivedQuantity& d) { return d.id == id; });
    return found == table.end() ? nullptr : found;
}

namespace {

/// Titles and units of one table, in its order, so that a look-up can hand out a pointer that stays valid.
template <typename Entry>
std::vector<QuantityKind> kinds_of(std::span<const Entry> entries) {
    std::vector<QuantityKind> kinds;
    for (const Entry& entry : entries) {
        kinds.push_back({entry.title, entry.unit, entry.substance});
    }
    return kinds;
}

const std::vector<QuantityKind> analyte_kinds = kinds_of(analytes());
const std::vector<QuantityKind> derived_kinds = kinds_of(derived_quantities());

}  // namespace

const QuantityKind* find_quantity(std::string_view id) noexcept {
    if (const Analyte* analyte = find_analyte(id)) {
        return &analyte_kinds[static_cast<std::size_t>(analyte - analytes().data())];
    }
    if (const DerivedQuantity* derived = find_derived(id)) {
        return &derived_kinds[static_cast<std::size_t>(derived - table.data())];
    }
    return nullptr;
}

}  // namespace steelyard::likelihoods
