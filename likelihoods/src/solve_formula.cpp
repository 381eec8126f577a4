// SPDX-License-Identifier: Apache-2.0
#include "solve_formula.hpp"

#include <cmath>
#include <limits>

#include "steelyard/likelihoods/chemistry.hpp"

namespace steelyard::likelihoods::detail {
namespace {

using X = std::span<const double>;
namespace c = chemistry;

/// Serum creatinine, umol/L to mg/dL, by the molar mass of the analyte table (113.12 g/mol).
constexpr double umol_l_to_mg_dl = 113.120 / 1e4;
/// Serum creatinine to the unit of urine creatinine, mmol/L.
constexpr double umol_to_mmol = 1e-3;

double filtration(double creatinine, X /*unused*/, const Person& person) {
    return c::ckd_epi_2021(creatinine * umol_l_to_mg_dl, person.age, person.female);
}

/// The equation of 2021 is a falling power of creatinine on either side of its knee.
double creatinine_for(double gfr, X /*unused*/, const Person& person) {
    const double knee = person.female ? 0.7 : 0.9;
    const double at_knee = c::ckd_epi_2021(knee, person.age, person.female);
    const double below = person.female ? -0.241 : -0.302;
    constexpr double above = -1.2;
    return knee * std::pow(gfr / at_knee, 1.0 / (gfr > at_knee ? below : above)) / umol_l_to_mg_dl;
}

double corrected_gap(double chloride, X x, const Person& p) {
    return c::anion_gap_corrected(c::anion_gap(x[0], chloride, x[1]), x[2], p.settings->albumin_slope,
                                  p.settings->albumin_reference);
}
double chloride_for_corrected_gap(double gap, X x, const Person& p) {
    return x[0] - x[1] - (gap - p.settings->albumin_slope * (p.settings->albumin_reference - x[2]));
}

// Fractional excretions. x: urine, serum, serum creatinine; or serum, urine creatinine, serum creatinine.
double excretion_by_creatinine(double urine_creatinine, X x, const Person& /*unused*/) {
    return c::fractional_excretion(x[0], x[1], urine_creatinine, x[2] * umol_to_mmol);
}
double creatinine_for_excretion(double excretion, X x, const Person& /*unused*/) {
    return 100.0 * x[0] * x[2] * umol_to_mmol / (x[1] * excretion);
}
double excretion_by_urine(double urine, X x, const Person& /*unused*/) {
    return c::fractional_excretion(urine, x[0], x[1], x[2] * umol_to_mmol);
}
double urine_for_excretion(double excretion, X x, const Person& /*unused*/) {
    return excretion * x[0] * x[1] / (100.0 * x[2] * umol_to_mmol);
}

// TmP/GFR. x: urine phosphate, urine creatinine, serum creatinine.
double phosphate_threshold(double phosphate, X x, const Person& /*unused*/) {
    return c::tmp_gfr(x[0], phosphate, x[1], x[2] * umol_to_mmol);
}
/// With e = what is excreted per volume filtered: P TRP = P - e up to the step; above it 0.3 TRP P / (1 - 0.8
/// TRP) is a quadratic in P.
double phosphate_for_threshold(double wanted, X x, const Person& /*unused*/) {
    const double excreted = x[0] * x[2] * umol_to_mmol / x[1];
    const double simple = wanted + excreted;
    if (wanted / simple <= c::reabsorption_step) {
        return simple;
    }
    const double b = 0.3 * excreted + 0.2 * wanted;
    return (b + std::sqrt(b * b + 4.0 * 0.3 * 0.8 * wanted * excreted)) / 0.6;
}

/// A way with one analyte alone beside the one solved for.
using One = const Person&;

const std::vector<Solution>& all_solutions() {
    static const std::vector<Solution> all = [] {
        std::vector<Solution> list = {
            {"anion_gap",
             "serum_chloride",
             {"serum_sodium", "serum_bicarbonate"},
             false,
             [](double gap, X x, One) { return x[0] - x[1] - gap; },
             [](double chloride, X x, One) { return c::anion_gap(x[0], chloride, x[1]); }},
            {"anion_gap_corrected",
             "serum_chloride",
             {"serum_sodium", "serum_bicarbonate", "serum_albumin"},
             false,
             chloride_for_corrected_gap,
             corrected_gap},
            {"gfr", "serum_creatinine", {}, true, creatinine_for, filtration},
            {"urine_anion_gap",
             "urine_chloride",
             {"urine_sodium", "urine_potassium"},
             false,
             [](double gap, X x, One) { return x[0] + x[1] - gap; },
             [](double chloride, X x, One) { return c::urine_anion_gap(x[0], x[1], chloride); }},
            {"urine_anion_gap",
             "urine_sodium",
             {"urine_potassium", "urine_chloride"},
             false,
             [](double gap, X x, One) { return gap + x[1] - x[0]; },
             [](double sodium, X x, One) { return c::urine_anion_gap(sodium, x[0], x[1]); }},
            {"urine_osmolal_gap",
             "urine_osmolality",
             {"urine_sodium", "urine_potassium", "urine_urea", "urine_glucose"},
             false,
             [](double gap, X x, One) { return gap + 2.0 * (x[0] + x[1]) + x[2] + x[3]; },
             [](double osmolality, X x, One) {
                 return c::urine_osmolal_gap(osmolality, x[0], x[1], x[2], x[3]);
             }},
            {"urine_osmolal_gap",
             "urine_urea",
             {"urine_osmolality", "urine_sodium", "urine_potassium", "urine_glucose"},
             false,
             [](double gap, X x, One) { return x[0] - gap - 2.0 * (x[1] + x[2]) - x[3]; },
             [](double urea, X x, One) { return c::urine_osmolal_gap(x[0], x[1], x[2], urea, x[3]); }},
            {"tmp_gfr",
             "serum_phosphate",
             {"urine_phosphate", "urine_creatinine", "serum_creatinine"},
             false,
             phosphate_for_threshold,
             phosphate_threshold},
            {"ttkg",
             "urine_osmolality",
             {"urine_potassium", "serum_potassium", "serum_osmolality"},
             false,
             [](double wanted, X x, One) { return x[0] / x[1] * x[2] / wanted; },
             [](double osmolality, X x, One) { return c::ttkg(x[0], x[1], osmolality, x[2]); }},
            {"ttkg",
             "urine_potassium",
             {"serum_potassium", "urine_osmolality", "serum_osmolality"},
             false,
             [](double wanted, X x, One) { return wanted * x[0] * x[1] / x[2]; },
             [](double potassium, X x, One) { return c::ttkg(potassium, x[0], x[1], x[2]); }},
            {"urine_potassium_creatinine",
             "urine_creatinine",
             {"urine_potassium"},
             false,
             [](double wanted, X x, One) { return x[0] / wanted; },
             [](double creatinine, X x, One) { return c::ratio(x[0], creatinine); }},
            {"urine_potassium_creatinine",
             "urine_potassium",
             {"urine_creatinine"},
             false,
             [](double wanted, X x, One) { return wanted * x[0]; },
             [](double potassium, X x, One) { return c::ratio(potassium, x[0]); }},
            {"urine_calcium_creatinine",
             "urine_calcium",
             {"urine_creatinine"},
             false,
             [](double wanted, X x, One) { return wanted * x[0]; },
             [](double calcium, X x, One) { return c::ratio(calcium, x[0]); }},
            {"chloride_sodium_ratio",
             "serum_chloride",
             {"serum_sodium"},
             false,
             [](double wanted, X x, One) { return wanted * x[0]; },
             [](double chloride, X x, One) { return c::ratio(chloride, x[0]); }},
            {"urine_sodium_chloride_ratio",
             "urine_chloride",
             {"urine_sodium"},
             false,
             [](double wanted, X x, One) { return x[0] / wanted; },
             [](double chloride, X x, One) { return c::ratio(x[0], chloride); }},
            {"serum_osmolality_estimate",
             "serum_urea",
             {"serum_sodium", "serum_glucose"},
             false,
             [](double wanted, X x, One) { return wanted - 2.0 * x[0] - x[1]; },
             [](double urea, X x, One) { return c::serum_osmolality(x[0], x[1], urea); }},
        };
        struct Excreted {
            std::string_view id, urine, serum;
        };
        for (const Excreted& one : {Excreted{"fe_sodium", "urine_sodium", "serum_sodium"},
                                    Excreted{"fe_potassium", "urine_potassium", "serum_potassium"},
                                    Excreted{"fe_phosphate", "urine_phosphate", "serum_phosphate"},
                                    Excreted{"fe_urate", "urine_urate", "serum_urate"},
                                    Excreted{"fe_bicarbonate", "urine_bicarbonate", "serum_bicarbonate"}}) {
            list.push_back({one.id,
                            one.urine,
                            {one.serum, "urine_creatinine", "serum_creatinine"},
                            false,
                            urine_for_excretion,
                            excretion_by_urine});
            list.push_back({one.id,
                            "urine_creatinine",
                            {one.urine, one.serum, "serum_creatinine"},
                            false,
                            creatinine_for_excretion,
                            excretion_by_creatinine});
        }
        return list;
    }();
    return all;
}

}  // namespace

std::span<const Solution> solutions() {
    return all_solutions();
}

}  // namespace steelyard::likelihoods::detail
