// SPDX-License-Identifier: Apache-2.0
#include "sensible_range.hpp"

#include <algorithm>
#include <array>

#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods::detail {
namespace {

struct Line {
    std::string_view id;
    SensibleRange range;
};

// Basis: elicited, all of it.
constexpr auto lines = std::to_array<Line>({
    {"serum_sodium", {131, 147, 0}},
    {"serum_potassium", {1.8, 7.4, 1}},
    {"serum_chloride", {92, 132, 1}},
    {"serum_bicarbonate", {5, 24, 1}},
    {"serum_total_co2", {6, 25, 1}},
    {"serum_albumin", {26, 46, 0}},
    {"serum_creatinine", {40, 1200, 0}},
    {"serum_urea", {3, 25, 1}},
    {"serum_glucose", {4.2, 8.8, 1}},
    {"serum_phosphate", {0.4, 2.4, 2}},
    {"serum_calcium", {1.7, 2.9, 2}},
    {"serum_magnesium", {0.4, 1.3, 2}},
    {"serum_lactate", {0.6, 2.0, 1}},
    {"serum_beta_hydroxybutyrate", {0.0, 0.4, 1}},
    {"serum_urate", {110, 620, 0}},
    {"serum_osmolality", {275, 315, 0}},
    {"serum_aldosterone", {30, 1500, 0}},
    {"plasma_renin_activity", {0.1, 15, 1}},
    {"plasma_renin_concentration", {2, 200, 0}},
    {"arterial_ph", {7.05, 7.40, 2}},
    {"arterial_pco2", {14, 44, 1}},
    {"arterial_bicarbonate", {5, 24, 1}},
    {"venous_ph", {7.02, 7.37, 2}},
    {"venous_pco2", {20, 50, 1}},
    {"venous_bicarbonate", {6, 25, 1}},
    {"urine_ph", {4.7, 8.0, 1}},
    {"urine_sodium", {20, 150, 0}},
    {"urine_potassium", {12, 90, 0}},
    {"urine_chloride", {10, 180, 0}},
    {"urine_urea", {60, 450, 0}},
    {"urine_glucose", {0, 0.8, 1}},
    {"urine_phosphate", {5, 30, 1}},
    {"urine_calcium", {0.4, 9, 1}},
    {"urine_bicarbonate", {0, 90, 1}},
    {"urine_creatinine", {2.5, 15, 1}},
    {"urine_urate", {800, 5000, 0}},
    {"urine_osmolality", {220, 900, 0}},
    {"urine_pco2", {30, 90, 0}},
    {"urine_ammonium", {2, 140, 0}},
    {"urine_ammonium_spot", {2, 150, 0}},
    {"urine_citrate", {0.1, 5, 2}},
    {"urine_ph_after_furosemide", {4.4, 7.4, 1}},
    {"anion_gap", {4, 22, 1}},
    {"anion_gap_corrected", {4, 22, 1}},
    {"delta_ratio", {-0.6, 1.4, 2}},
    {"expected_pco2", {16, 42, 1}},
    {"bicarbonate_from_gas", {5, 24, 1}},
    {"urine_bicarbonate_estimate", {0, 90, 1}},
    {"urine_anion_gap", {-70, 90, 0}},
    {"urine_osmolal_gap", {20, 520, 0}},
    {"urine_ammonium_estimate", {5, 200, 0}},
    {"gfr", {5, 125, 0}},
    {"fe_sodium", {0.1, 8, 1}},
    {"fe_potassium", {3, 75, 1}},
    {"fe_bicarbonate", {0.5, 30, 1}},
    {"fe_phosphate", {3, 50, 1}},
    {"fe_urate", {3, 45, 1}},
    {"tmp_gfr", {0.3, 1.5, 2}},
    {"ttkg", {1, 14, 1}},
    {"urine_potassium_creatinine", {1, 25, 1}},
    {"urine_calcium_creatinine", {0.05, 1.8, 2}},
    {"chloride_sodium_ratio", {0.70, 0.88, 3}},
    {"urine_sodium_chloride_ratio", {0.3, 3, 2}},
    {"serum_osmolality_estimate", {272, 325, 0}},
    {"sodium_corrected", {131, 147, 1}},
});

}  // namespace

SensibleRange sensible_range(std::string_view quantity) {
    const auto line =
        std::find_if(lines.begin(), lines.end(), [&](const Line& one) { return one.id == quantity; });
    if (line != lines.end()) {
        return line->range;
    }
    if (const Analyte* analyte = find_analyte(quantity)) {
        return {analyte->plausible_low, analyte->plausible_high, 1};
    }
    const DerivedQuantity* derived = find_derived(quantity);
    return derived == nullptr ? SensibleRange{}
                              : SensibleRange{derived->plausible_low, derived->plausible_high, 1};
}

}  // namespace steelyard::likelihoods::detail
