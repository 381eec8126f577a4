// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/chemistry.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace steelyard::likelihoods::chemistry {
namespace {

constexpr double outside = std::numeric_limits<double>::quiet_NaN();

}  // namespace

double anion_gap(double sodium, double chloride, double bicarbonate) noexcept {
    return sodium - chloride - bicarbonate;
}

double anion_gap_corrected(double gap, double albumin, double slope, double reference) noexcept {
    return gap + slope * (reference - albumin);
}

double delta_ratio(double gap, double bicarbonate, double gap_reference,
                   double bicarbonate_reference) noexcept {
    const double fall = bicarbonate_reference - bicarbonate;
    return fall > 0.0 ? (gap - gap_reference) / fall : outside;
}

double expected_pco2(double bicarbonate, double slope, double intercept) noexcept {
    return slope * bicarbonate + intercept;
}

double ph_from_gas(double bicarbonate, double pco2) noexcept {
    return bicarbonate > 0.0 && pco2 > 0.0 ? plasma_pk + std::log10(bicarbonate / (co2_solubility * pco2))
                                           : outside;
}

double bicarbonate_from_gas(double ph, double pco2) noexcept {
    return pco2 > 0.0 ? co2_solubility * pco2 * std::pow(10.0, ph - plasma_pk) : outside;
}

double hydrogen_ion(double bicarbonate, double pco2) noexcept {
    return bicarbonate > 0.0 ? 24.0 * pco2 / bicarbonate : outside;
}

double bicarbonate_from_total_co2(double total_co2) noexcept {
    return total_co2 - dissolved_co2;
}

double urine_anion_gap(double sodium, double potassium, double chloride) noexcept {
    return sodium + potassium - chloride;
}

double urine_osmolal_gap(double osmolality, double sodium, double potassium, double urea,
                         double glucose) noexcept {
    return osmolality - (2.0 * (sodium + potassium) + urea + glucose);
}

double ammonium_from_osmolal_gap(double gap) noexcept {
    return gap / 2.0;
}

double ammonium_from_anion_gap(double gap) noexcept {
    return 82.0 - 0.8 * gap;
}

double fractional_excretion(double urine, double plasma, double urine_creatinine,
                            double plasma_creatinine) noexcept {
    return plasma > 0.0 && urine_creatinine > 0.0
               ? 100.0 * (urine * plasma_creatinine) / (plasma * urine_creatinine)
               : outside;
}

double urine_bicarbonate(double ph, double pco2, double sodium, double potassium) noexcept {
    const double cations = (sodium + potassium) / 1000.0;  // mol/L
    if (!(pco2 > 0.0) || !(cations >= 0.0)) {
        return outside;
    }
    return 0.0309 * pco2 * std::pow(10.0, ph - (6.33 - 0.5 * std::sqrt(cations)));
}

double ttkg(double urine_potassium, double plasma_potassium, double urine_osmolality,
            double plasma_osmolality) noexcept {
    return plasma_potassium > 0.0 && urine_osmolality > 0.0
               ? (urine_potassium / plasma_potassium) * (plasma_osmolality / urine_osmolality)
               : outside;
}

double phosphate_reabsorption(double urine_phosphate, double plasma_phosphate, double urine_creatinine,
                              double plasma_creatinine) noexcept {
    return 1.0 -
           fractional_excretion(urine_phosphate, plasma_phosphate, urine_creatinine, plasma_creatinine) /
               100.0;
}

double tmp_gfr_per_phosphate(double reabsorption) noexcept {
    if (!(reabsorption >= 0.0 && reabsorption <= 1.0)) {
        return outside;
    }
    return reabsorption <= reabsorption_step ? reabsorption : 0.3 * reabsorption / (1.0 - 0.8 * reabsorption);
}

double tmp_gfr(double urine_phosphate, double plasma_phosphate, double urine_creatinine,
               double plasma_creatinine) noexcept {
    return plasma_phosphate * tmp_gfr_per_phosphate(phosphate_reabsorption(
                                  urine_phosphate, plasma_phosphate, urine_creatinine, plasma_creatinine));
}

double ckd_epi_2021(double creatinine_mg_dl, double age, bool female) noexcept {
    if (!(creatinine_mg_dl > 0.0) || !(age >= 18.0)) {
        return outside;
    }
    const double relative = creatinine_mg_dl / (female ? 0.7 : 0.9);
    const double alpha = female ? -0.241 : -0.302;
    return 142.0 * std::pow(std::min(relative, 1.0), alpha) * std::pow(std::max(relative, 1.0), -1.200) *
           std::pow(0.9938, age) * (female ? 1.012 : 1.0);
}

double sodium_corrected(double sodium, double glucose, double slope) noexcept {
    return sodium + slope * std::max(0.0, glucose - glucose_reference) / glucose_reference;
}

double sodium_corrected_two_slopes(double sodium, double glucose) noexcept {
    constexpr double bend = 4.0 * glucose_reference;  // 400 mg/dL
    return sodium_corrected(sodium, std::min(glucose, bend)) +
           4.0 * std::max(0.0, glucose - bend) / glucose_reference;
}

double serum_osmolality(double sodium, double glucose, double urea) noexcept {
    return 2.0 * sodium + glucose + urea;
}

double ratio(double numerator, double denominator) noexcept {
    return denominator > 0.0 ? numerator / denominator : outside;
}

}  // namespace steelyard::likelihoods::chemistry
