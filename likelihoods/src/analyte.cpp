// SPDX-License-Identifier: Apache-2.0
// The analytes. Molar masses from the standard atomic weights H 1.008, C 12.011, N 14.007, O 15.999,
// P 30.974, Mg 24.305, Ca 40.078. meq/L is accepted for monovalent ions only, where no doubt is possible.
//
// Plausible ranges are elicited: what a laboratory would still believe of a living adult, not a reference
// interval. Where the commonest slip (mg/dL for mmol/L, kPa for mmHg, a lost decimal point) can be told from
// a patient, the range is drawn so that it is; the slip that an end guards against stands beside it.

#include "steelyard/likelihoods/analyte.hpp"

#include <algorithm>
#include <array>

namespace steelyard::likelihoods {
namespace {

constexpr Substance ion{0.0, 1};
constexpr Substance no_mass{0.0, 0};
constexpr Substance albumin{66500.0, 0};  // by convention of laboratories that print umol/L
constexpr Substance creatinine{113.120, 0};
constexpr Substance urea{60.056, 0};
constexpr Substance urea_nitrogen{28.014, 0};  // two nitrogen atoms a mole of urea: the mmol/L are of urea
constexpr Substance glucose{180.156, 0};
constexpr Substance phosphorus{30.974, 0};  // laboratories report mg of phosphorus
constexpr Substance calcium{40.078, 0};
constexpr Substance magnesium{24.305, 0};
constexpr Substance lactic_acid{90.078, 0};  // the anion, 89.07, is the other convention: 1.1 % apart
constexpr Substance hydroxybutyric_acid{104.105, 0};
constexpr Substance uric_acid{168.112, 0};
constexpr Substance aldosterone{360.450, 0};
constexpr Substance citric_acid{192.123, 0};  // the ion, 189.1, is the other convention: 1.6 % apart

constexpr auto table = std::to_array<Analyte>({
    {"serum_sodium", "Serum sodium", "mmol/L", ion, 90.0, 210.0, false},
    {"serum_potassium", "Serum potassium", "mmol/L", ion, 1.0, 12.0, false},  // 28 for 2.8
    {"serum_chloride", "Serum chloride", "mmol/L", ion, 50.0, 170.0, false},
    {"serum_bicarbonate", "Serum bicarbonate", "mmol/L", ion, 1.0, 65.0, false},
    {"serum_total_co2", "Serum total CO2", "mmol/L", ion, 1.0, 65.0, false},
    {"serum_albumin", "Serum albumin", "g/L", albumin, 5.0, 70.0, false},  // 3.8 g/L for g/dL
    {"serum_creatinine", "Serum creatinine", "umol/L", creatinine, 15.0, 3000.0,
     false},  // 0.8 or 10 for mg/dL
    {"serum_urea", "Serum urea", "mmol/L", urea, 0.5, 100.0, false},
    {"serum_glucose", "Serum glucose", "mmol/L", glucose, 0.5, 80.0, false},  // 90 mmol/L for mg/dL; 5 mg/dL
    {"serum_phosphate", "Serum phosphate", "mmol/L", phosphorus, 0.1, 8.0, false},
    {"serum_calcium", "Serum calcium", "mmol/L", calcium, 0.8, 6.0,
     false},  // 9.2 mmol/L for mg/dL; 2.3 mg/dL
    {"serum_magnesium", "Serum magnesium", "mmol/L", magnesium, 0.1, 8.0, false},
    {"serum_lactate", "Serum lactate", "mmol/L", lactic_acid, 0.1, 40.0, false},
    {"serum_beta_hydroxybutyrate", "Serum beta-hydroxybutyrate", "mmol/L", hydroxybutyric_acid, 0.0, 35.0,
     false},
    {"serum_urate", "Serum urate", "umol/L", uric_acid, 12.0, 2000.0, false},  // 5 umol/L for mg/dL
    {"serum_osmolality", "Serum osmolality", "mosm/kg", no_mass, 180.0, 550.0, false},
    {"serum_aldosterone", "Serum aldosterone", "pmol/L", aldosterone, 0.0, 30000.0, false},
    {"plasma_renin_activity", "Plasma renin activity", "ng/mL/h", no_mass, 0.0, 200.0, false},
    {"plasma_renin_concentration", "Plasma renin concentration", "m[IU]/L", no_mass, 0.0, 5000.0, false},
    {"arterial_ph", "Arterial pH", "[pH]", no_mass, 6.5, 7.9, true},
    {"arterial_pco2", "Arterial pCO2", "mm[Hg]", no_mass, 8.0, 200.0, false},  // 5.3 for kPa; 40 kPa for mmHg
    {"arterial_bicarbonate", "Arterial bicarbonate", "mmol/L", ion, 1.0, 65.0, false},
    {"venous_ph", "Venous pH", "[pH]", no_mass, 6.5, 7.9, true},
    {"venous_pco2", "Venous pCO2", "mm[Hg]", no_mass, 8.0, 220.0, false},
    {"venous_bicarbonate", "Venous bicarbonate", "mmol/L", ion, 1.0, 65.0, false},
    {"urine_ph", "Urine pH", "[pH]", no_mass, 4.0, 9.5, true},
    {"urine_sodium", "Urine sodium", "mmol/L", ion, 0.0, 500.0, false},
    {"urine_potassium", "Urine potassium", "mmol/L", ion, 0.0, 400.0, false},
    {"urine_chloride", "Urine chloride", "mmol/L", ion, 0.0, 500.0, false},
    {"urine_urea", "Urine urea", "mmol/L", urea, 0.0, 1500.0, false},
    {"urine_glucose", "Urine glucose", "mmol/L", glucose, 0.0, 800.0, false},
    {"urine_phosphate", "Urine phosphate", "mmol/L", phosphorus, 0.0, 200.0, false},
    {"urine_calcium", "Urine calcium", "mmol/L", calcium, 0.0, 40.0, false},
    {"urine_bicarbonate", "Urine bicarbonate", "mmol/L", ion, 0.0, 350.0, false},
    {"urine_creatinine", "Urine creatinine", "mmol/L", creatinine, 0.2, 50.0,
     false},  // 80 for mg/dL, 5300 for umol/L
    {"urine_urate", "Urine urate", "umol/L", uric_acid, 10.0, 20000.0, false},  // 2.5 umol/L for mmol/L
    {"urine_osmolality", "Urine osmolality", "mosm/kg", no_mass, 20.0, 1500.0, false},
    {"urine_pco2", "Urine pCO2", "mm[Hg]", no_mass, 8.0, 250.0, false},
    {"urine_ammonium", "Urine ammonium, 24 h", "mmol/d", ion, 0.0, 500.0, false},
    {"urine_ammonium_spot", "Urine ammonium", "mmol/L", ion, 0.0, 500.0, false},        // 25000 for umol/L
    {"urine_citrate", "Urine citrate, 24 h", "mmol/d", citric_acid, 0.0, 20.0, false},  // 320 for mg/d
    {"urine_ph_after_furosemide", "Urine pH after furosemide", "[pH]", no_mass, 4.0, 9.5, true},
});

constexpr auto aliases = std::to_array<EntryAlias>({
    {"serum_urea_nitrogen", "serum_urea", urea_nitrogen},
    {"urine_urea_nitrogen", "urine_urea", urea_nitrogen},
});

}  // namespace

std::span<const Analyte> analytes() {
    return table;
}

const Analyte* find_analyte(std::string_view id) noexcept {
    const auto* const found =
        std::find_if(table.begin(), table.end(), [&](const Analyte& a) { return a.id == id; });
    return found == table.end() ? nullptr : found;
}

std::span<const EntryAlias> entry_aliases() {
    return aliases;
}

}  // namespace steelyard::likelihoods
