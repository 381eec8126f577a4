// SPDX-License-Identifier: Apache-2.0
#pragma once
// The formulas, as plain functions of numbers. Each states its units, its source and the basis of its
// coefficients. Outside its domain a function returns NaN, never an exception: derive() looks first and says
// what is lacking. Concentrations are in mmol/L and from one sample unless said otherwise.

namespace steelyard::likelihoods::chemistry {

/// Solubility of CO2 in plasma at 37 C [mmol/L per mm[Hg]]. Basis: memory (teaching texts print 0.03).
inline constexpr double co2_solubility = 0.0307;
/// Apparent first dissociation exponent of carbonic acid in plasma. Basis: memory.
inline constexpr double plasma_pk = 6.1;
/// By how much total CO2 exceeds bicarbonate [mmol/L]: dissolved CO2, mainly. Basis: memory.
inline constexpr double dissolved_co2 = 1.0;
/// The glucose [mmol/L] from which the correction of sodium starts: 100 mg/dL. KATZ1973.
inline constexpr double glucose_reference = 5.55;

/// Serum anion gap, Na - Cl - HCO3 [mmol/L]. The measured sodium belongs here, not the one corrected for
/// glucose.
double anion_gap(double sodium, double chloride, double bicarbonate) noexcept;

/// Gap corrected for albumin, gap + slope (reference - albumin) [mmol/L], albumin in g/L.
/// Slope 0.25 mmol/g: FIGGE1998, study. The reference (40 or 44 g/L) shifts the result by 1 mmol/L: the
/// clinic chooses.
double anion_gap_corrected(double gap, double albumin, double slope, double reference) noexcept;

/// (gap - gap_reference) / (bicarbonate_reference - bicarbonate) [1]; NaN unless bicarbonate is below its
/// reference. Practice; RASTEGAR2007 on its limits.
double delta_ratio(double gap, double bicarbonate, double gap_reference,
                   double bicarbonate_reference) noexcept;

/// pCO2 expected from compensation of a metabolic acidosis, slope HCO3 + intercept [mm[Hg]]. 1.54 and 8.36:
/// Albert, Dell and Winters, Ann Intern Med 1967;66:312 (60 patients; coefficients from memory). 1.5 and 8:
/// the common rounding.
double expected_pco2(double bicarbonate, double slope, double intercept) noexcept;

/// pH = 6.1 + log10(HCO3 / (a pCO2)), pCO2 in mm[Hg]; NaN unless both are > 0. Henderson-Hasselbalch.
double ph_from_gas(double bicarbonate, double pco2) noexcept;
/// HCO3 = a pCO2 10^(pH - 6.1) [mmol/L], the same solved for bicarbonate; NaN unless pCO2 > 0.
double bicarbonate_from_gas(double ph, double pco2) noexcept;
/// Hydrogen ion, 24 pCO2 / HCO3 [nmol/L], the Henderson form; NaN unless HCO3 > 0.
double hydrogen_ion(double bicarbonate, double pco2) noexcept;
/// Bicarbonate from total CO2, tCO2 - 1 [mmol/L].
double bicarbonate_from_total_co2(double total_co2) noexcept;

/// Urine anion gap, Na + K - Cl [mmol/L]. GOLDSTEIN1986, BATLLE1988.
double urine_anion_gap(double sodium, double potassium, double chloride) noexcept;
/// Urine osmolal gap [mosm/kg]: osmolality [mosm/kg] - (2 (Na + K) + urea + glucose), all four in mmol/L,
/// urea as urea (not nitrogen). KIM1996 (study, abstract) left glucose out; with glycosuria it must be in.
double urine_osmolal_gap(double osmolality, double sodium, double potassium, double urea,
                         double glucose) noexcept;
/// Ammonium from the osmolal gap, gap / 2 [mmol/L]: each ammonium comes with one anion. KIM1996.
double ammonium_from_osmolal_gap(double gap) noexcept;
/// Ammonium from the anion gap, 82 - 0.8 gap [mmol/L], 24 h urine. GOLDSTEIN1986, study (abstract), r 0.97 in
/// acidosis; RAPHAEL2018 found no useful relation in chronic kidney disease.
double ammonium_from_anion_gap(double gap) noexcept;

/// Fractional excretion, 100 (Ux Pcr) / (Px Ucr) [%]; x in one unit in both samples, creatinine in one unit
/// in both. NaN unless Px > 0 and Ucr > 0.
double fractional_excretion(double urine, double plasma, double urine_creatinine,
                            double plasma_creatinine) noexcept;

/// Urine bicarbonate from urine pH and pCO2 [mmol/L]: 0.0309 pCO2 10^(pH - pK'), pK' = 6.33 - 0.5 sqrt(Na +
/// K), with Na + K in mol/L inside the root; the arguments are mmol/L. Basis: memory. NaN unless pCO2 > 0 and
/// Na + K >= 0.
double urine_bicarbonate(double ph, double pco2, double sodium, double potassium) noexcept;

/// Transtubular potassium gradient, (Ku / Kp) / (Osm_u / Osm_p) [1]; NaN unless Kp, Osm_u > 0. ETHIER1990.
/// When it may be read (urine osmolality above plasma, urine sodium > 25) is a matter of the evidence table.
double ttkg(double urine_potassium, double plasma_potassium, double urine_osmolality,
            double plasma_osmolality) noexcept;

/// Tubular reabsorption of phosphate, 1 - (Pu Crp) / (Pp Cru) [1]; NaN unless Pp, Cru > 0.
double phosphate_reabsorption(double urine_phosphate, double plasma_phosphate, double urine_creatinine,
                              double plasma_creatinine) noexcept;
/// The reabsorption up to which TmP/GFR is TRP x Pp. At this point the two branches differ by 4 %: a step of
/// the published algorithm, which is therefore not monotone across it.
inline constexpr double reabsorption_step = 0.86;
/// TmP/GFR per plasma phosphate: TRP up to 0.86, above it 0.3 TRP / (1 - 0.8 TRP) [1]. NaN unless 0 <= TRP
/// <= 1. PAYNE1998; formula from memory.
double tmp_gfr_per_phosphate(double reabsorption) noexcept;
/// TmP/GFR [mmol/L], fasting sample; creatinine in one unit in both samples.
double tmp_gfr(double urine_phosphate, double plasma_phosphate, double urine_creatinine,
               double plasma_creatinine) noexcept;

/// GFR by the CKD-EPI creatinine equation of 2021 [mL/min/{1.73_m2}]: 142 min(S/k, 1)^a max(S/k, 1)^-1.2
/// 0.9938^age (x 1.012 for women); k 0.7, a -0.241 for women; k 0.9, a -0.302 for men. INKER2021;
/// coefficients read in a guideline body's statement of the equation. Creatinine in mg/dL, age in years, >=
/// 18, steady state; NaN otherwise.
double ckd_epi_2021(double creatinine_mg_dl, double age, bool female) noexcept;

/// Sodium corrected for hyperglycaemia, Na + slope (glucose - 5.55) / 5.55 above 5.55 mmol/L [mmol/L];
/// slope 1.6: KATZ1973; 2.4: HILLIER1999 (6 healthy subjects).
double sodium_corrected(double sodium, double glucose, double slope = 1.6) noexcept;
/// The same with two slopes: 1.6 up to a glucose of 22.2 mmol/L (400 mg/dL), 4.0 for the part above.
/// HILLIER1999, abstract; that 4.0 applies to the part above only is our reading.
double sodium_corrected_two_slopes(double sodium, double glucose) noexcept;

/// Calculated plasma osmolality, 2 Na + glucose + urea [mosm/kg]. Practice.
double serum_osmolality(double sodium, double glucose, double urea) noexcept;

/// numerator / denominator [1]; NaN unless the denominator is > 0. For chloride to sodium (BEREND2017), urine
/// sodium to chloride, and urine potassium or calcium to creatinine.
double ratio(double numerator, double denominator) noexcept;

}  // namespace steelyard::likelihoods::chemistry
