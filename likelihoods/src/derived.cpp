// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/derived.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <initializer_list>
#include <utility>

#include "derivation_steps.hpp"
#include "steelyard/likelihoods/box.hpp"
#include "steelyard/likelihoods/chemistry.hpp"

namespace steelyard::likelihoods {
namespace {

using Ids = std::vector<std::string_view>;
using detail::DerivationStep;
using detail::FormulaContext;
using detail::PointFormula;
using Values = const double*;
using Context = const FormulaContext&;

/// The equation for GFR wants mg/dL, by the molar mass of the analyte table (113.12 g/mol).
constexpr double umol_l_to_mg_dl = 113.120 / 1e4;
/// Serum creatinine is canonical in umol/L, urine creatinine in mmol/L.
constexpr double umol_to_mmol = 1e-3;

/// Computes quantity after quantity into one result; later ones may rest on earlier ones.
class Derivation {
  public:
    /// @param steps  when given, what would be computed is noted there in place of being computed, as if
    /// every formula had a value
    Derivation(const Panel& panel, const ChemistrySettings& settings,
               std::vector<DerivationStep>* steps = nullptr)
        : panel_(panel),
          context_{settings, panel.age.value_or(0.0), panel.sex == Sex::female},
          steps_(steps) {
        for (const auto& [id, reading] : panel.measured) {
            if (const Analyte* analyte = find_analyte(id)) {
                result_.known[id] = {reading.value, analyte->unit, Origin::measured, {}, {}};
            }
        }
        for (const auto& [id, reading] : panel.given) {
            if (const DerivedQuantity* kind = find_derived(id)) {
                result_.known[id] = {reading.value, kind->unit, Origin::given, {}, {}};
            }
        }
    }

    Quantities run() && {
        blood_gas();
        serum();
        filtration();
        urine_gaps();
        excretions();
        return std::move(result_);
    }

  private:
    bool has(std::string_view id) const { return result_.find(id) != nullptr; }
    bool is_computed(std::string_view id) const {
        const QuantityValue* value = result_.find(id);
        return value != nullptr && value->origin == Origin::computed;
    }

    void lacks(std::string_view id, std::vector<std::string> what) {
        result_.lacking[std::string(id)] = std::move(what);
    }

    /// What of `needs` is not known; empty when all is there.
    std::vector<std::string> missing(const Ids& needs) const {
        std::vector<std::string> absent;
        for (const std::string_view need : needs) {
            if (!has(need)) {
                absent.emplace_back(need);
            }
        }
        return absent;
    }

    std::vector<Interval> box_of(const Ids& inputs) const {
        std::vector<Interval> box;
        for (const std::string_view input : inputs) {
            box.push_back(result_.find(input)->value);
        }
        return box;
    }

    void keep(std::string_view id, std::string_view unit, const Interval& value, const Ids& inputs,
              std::string remark) {
        QuantityValue quantity{value, unit, Origin::computed, {}, {}};
        const auto add_unique = [](std::vector<std::string>& list, std::string_view text) {
            if (std::find(list.begin(), list.end(), text) == list.end()) {
                list.emplace_back(text);
            }
        };
        for (const std::string_view input : inputs) {
            const QuantityValue& used = *result_.find(input);
            if (used.origin != Origin::computed) {
                add_unique(quantity.from, input);
            }
            for (const std::string& origin : used.from) {
                add_unique(quantity.from, origin);
            }
            for (const std::string& inherited : used.remarks) {
                add_unique(quantity.remarks, inherited);
            }
        }
        if (!remark.empty()) {
            quantity.remarks.push_back(std::move(remark));
        }
        result_.known.insert_or_assign(std::string(id), std::move(quantity));
    }

    /// One derived quantity by its formula. @param domain  what is required, in words, where the formula has
    /// no value
    void compute(std::string_view id, const Ids& inputs, PointFormula formula, std::string_view domain = {},
                 std::string remark = {}) {
        if (has(id)) {
            return;  // given in the case
        }
        if (std::vector<std::string> absent = missing(inputs); !absent.empty()) {
            lacks(id, std::move(absent));
            return;
        }
        if (const std::optional<Interval> value = image(id, inputs, formula)) {
            keep(id, find_derived(id)->unit, *value, inputs, std::move(remark));
        } else {
            lacks(id, {std::string(domain)});
        }
    }

    std::optional<Interval> image(std::string_view id, const Ids& inputs, PointFormula formula) {
        if (steps_ != nullptr) {
            steps_->push_back({id, inputs, formula});
            return Interval::point(1.0);
        }
        return image_of_box(box_of(inputs),
                            [&](const std::vector<double>& x) { return formula(x.data(), context_); });
    }

    /// A stand-in for serum bicarbonate. @returns whether there is one now
    bool stand_in(const Ids& inputs, PointFormula formula, std::string remark) {
        if (has("serum_bicarbonate")) {
            return true;
        }
        if (!missing(inputs).empty()) {
            return false;
        }
        if (const std::optional<Interval> value = image("serum_bicarbonate", inputs, formula)) {
            keep("serum_bicarbonate", "mmol/L", *value, inputs, std::move(remark));
        }
        return has("serum_bicarbonate");
    }

    void blood_gas() {
        const PointFormula henderson = [](Values x, Context) {
            return chemistry::bicarbonate_from_gas(x[0], x[1]);
        };
        const PointFormula same = [](Values x, Context) { return x[0]; };
        const bool venous_only = !missing({"arterial_ph", "arterial_pco2"}).empty() &&
                                 missing({"venous_ph", "venous_pco2"}).empty();
        compute("bicarbonate_from_gas",
                venous_only ? Ids{"venous_ph", "venous_pco2"} : Ids{"arterial_ph", "arterial_pco2"},
                henderson, "a pCO2 above 0");
        const PointFormula less_dissolved = [](Values x, Context) {
            return chemistry::bicarbonate_from_total_co2(x[0]);
        };
        stand_in({"serum_total_co2"}, less_dissolved, "bicarbonate taken as total CO2 less 1 mmol/L") ||
            stand_in({"arterial_bicarbonate"}, same, "bicarbonate taken from the arterial gas") ||
            stand_in({"arterial_ph", "arterial_pco2"}, henderson,
                     "bicarbonate computed from arterial pH and pCO2") ||
            stand_in({"venous_bicarbonate"}, same, "bicarbonate taken from the venous gas") ||
            stand_in({"venous_ph", "venous_pco2"}, henderson, "bicarbonate computed from venous pH and pCO2");
    }

    void serum() {
        compute("anion_gap", {"serum_sodium", "serum_chloride", "serum_bicarbonate"},
                [](Values x, Context) { return chemistry::anion_gap(x[0], x[1], x[2]); });
        compute("anion_gap_corrected", {"anion_gap", "serum_albumin"},
                [](Values x, Context c) { return corrected(x[0], x[1], c.settings); });
        delta_ratio();
        compute("expected_pco2", {"serum_bicarbonate"}, [](Values x, Context c) {
            return chemistry::expected_pco2(x[0], c.settings.expected_pco2_slope,
                                            c.settings.expected_pco2_intercept);
        });
        compute("chloride_sodium_ratio", {"serum_chloride", "serum_sodium"},
                [](Values x, Context) { return chemistry::ratio(x[0], x[1]); });
        compute("serum_osmolality_estimate", {"serum_sodium", "serum_glucose", "serum_urea"},
                [](Values x, Context) { return chemistry::serum_osmolality(x[0], x[1], x[2]); });
        compute("sodium_corrected", {"serum_sodium", "serum_glucose"},
                [](Values x, Context) { return chemistry::sodium_corrected(x[0], x[1]); });
    }

    static double corrected(double gap, double albumin, const ChemistrySettings& s) {
        return chemistry::anion_gap_corrected(gap, albumin, s.albumin_slope, s.albumin_reference);
    }
    static double delta(double gap_corrected, double bicarbonate, const ChemistrySettings& s) {
        return chemistry::delta_ratio(gap_corrected, bicarbonate, s.anion_gap_reference,
                                      s.bicarbonate_reference);
    }

    /// Bicarbonate stands in the gap and in the denominator, so the ratio is evaluated from what the gap was
    /// made of.
    void delta_ratio() {
        const std::string domain = fmt::format("a serum bicarbonate below its reference of {} mmol/L",
                                               context_.settings.bicarbonate_reference);
        if (!has("anion_gap_corrected")) {
            if (!has("delta_ratio")) {
                lacks("delta_ratio", result_.lacking["anion_gap_corrected"]);
            }
        } else if (!is_computed("anion_gap_corrected")) {
            compute(
                "delta_ratio", {"anion_gap_corrected", "serum_bicarbonate"},
                [](Values x, Context c) { return delta(x[0], x[1], c.settings); }, domain);
        } else if (!is_computed("anion_gap")) {
            compute(
                "delta_ratio", {"anion_gap", "serum_albumin", "serum_bicarbonate"},
                [](Values x, Context c) {
                    return delta(corrected(x[0], x[1], c.settings), x[2], c.settings);
                },
                domain);
        } else {
            compute(
                "delta_ratio", {"serum_sodium", "serum_chloride", "serum_bicarbonate", "serum_albumin"},
                [](Values x, Context c) {
                    const double gap = chemistry::anion_gap(x[0], x[1], x[2]);
                    return delta(corrected(gap, x[3], c.settings), x[2], c.settings);
                },
                domain);
        }
    }

    void filtration() {
        if (has("gfr")) {
            return;
        }
        std::vector<std::string> absent = missing({"serum_creatinine"});
        if (panel_.sex == Sex::unknown) {
            absent.emplace_back("sex");
        }
        if (!panel_.age) {
            absent.emplace_back("age");
        }
        if (!absent.empty()) {
            lacks("gfr", std::move(absent));
            return;
        }
        compute(
            "gfr", {"serum_creatinine"},
            [](Values x, Context c) {
                return chemistry::ckd_epi_2021(x[0] * umol_l_to_mg_dl, c.age, c.female);
            },
            "an age of at least 18 years: the equation is for adults");
    }

    void urine_gaps() {
        compute("urine_anion_gap", {"urine_sodium", "urine_potassium", "urine_chloride"},
                [](Values x, Context) { return chemistry::urine_anion_gap(x[0], x[1], x[2]); });
        osmolal_gap();
        if (has("urine_osmolal_gap")) {
            compute("urine_ammonium_estimate", {"urine_osmolal_gap"},
                    [](Values x, Context) { return chemistry::ammonium_from_osmolal_gap(x[0]); });
        } else {
            compute(
                "urine_ammonium_estimate", {"urine_anion_gap"},
                [](Values x, Context) { return chemistry::ammonium_from_anion_gap(x[0]); }, {},
                "ammonium estimated from the urine anion gap, not from the osmolal gap");
        }
        compute(
            "urine_sodium_chloride_ratio", {"urine_sodium", "urine_chloride"},
            [](Values x, Context) { return chemistry::ratio(x[0], x[1]); }, "a urine chloride above 0");
        compute("urine_bicarbonate_estimate", {"urine_ph", "urine_pco2", "urine_sodium", "urine_potassium"},
                [](Values x, Context) { return chemistry::urine_bicarbonate(x[0], x[1], x[2], x[3]); });
    }

    /// Urine glucose belongs in the gap whenever there is any. Where it was not measured the gap is computed
    /// without it and says so; where glycosuria was seen the gap would read too high and is not computed.
    void osmolal_gap() {
        Ids inputs{"urine_osmolality", "urine_sodium", "urine_potassium", "urine_urea"};
        if (has("urine_glucose")) {
            inputs.emplace_back("urine_glucose");
            compute("urine_osmolal_gap", inputs, [](Values x, Context) {
                return chemistry::urine_osmolal_gap(x[0], x[1], x[2], x[3], x[4]);
            });
            return;
        }
        const auto glycosuria = panel_.observed.find("glycosuria");
        if (glycosuria != panel_.observed.end() && glycosuria->second.level == "present" &&
            !has("urine_osmolal_gap")) {
            std::vector<std::string> absent = missing(inputs);
            absent.emplace_back(absent.empty() ? "glycosuria is present and urine glucose was not given"
                                               : "urine_glucose");
            lacks("urine_osmolal_gap", std::move(absent));
            return;
        }
        compute(
            "urine_osmolal_gap", inputs,
            [](Values x, Context) { return chemistry::urine_osmolal_gap(x[0], x[1], x[2], x[3], 0.0); }, {},
            "urine glucose was not given and is left out: with glycosuria the gap reads too high");
    }

    void fractional_excretion(std::string_view id, std::string_view urine, std::string_view serum) {
        compute(
            id, {urine, serum, "urine_creatinine", "serum_creatinine"},
            [](Values x, Context) {
                return chemistry::fractional_excretion(x[0], x[1], x[2], x[3] * umol_to_mmol);
            },
            "a serum value above 0");
    }

    void excretions() {
        fractional_excretion("fe_sodium", "urine_sodium", "serum_sodium");
        fractional_excretion("fe_potassium", "urine_potassium", "serum_potassium");
        fractional_excretion("fe_phosphate", "urine_phosphate", "serum_phosphate");
        fractional_excretion("fe_urate", "urine_urate", "serum_urate");
        const bool estimated = !has("urine_bicarbonate") && has("urine_bicarbonate_estimate");
        fractional_excretion("fe_bicarbonate", estimated ? "urine_bicarbonate_estimate" : "urine_bicarbonate",
                             "serum_bicarbonate");
        phosphate_threshold();
        const bool osmolality_estimated = !has("serum_osmolality") && has("serum_osmolality_estimate");
        compute(
            "ttkg",
            {"urine_potassium", "serum_potassium", "urine_osmolality",
             osmolality_estimated ? "serum_osmolality_estimate" : "serum_osmolality"},
            [](Values x, Context) { return chemistry::ttkg(x[0], x[1], x[2], x[3]); }, {},
            osmolality_estimated ? "serum osmolality was calculated, not measured" : "");
        const PointFormula ratio = [](Values x, Context) { return chemistry::ratio(x[0], x[1]); };
        compute("urine_potassium_creatinine", {"urine_potassium", "urine_creatinine"}, ratio);
        compute("urine_calcium_creatinine", {"urine_calcium", "urine_creatinine"}, ratio);
    }

    /// TmP/GFR steps down by 4 % where the reabsorption passes 0.86. An interval that lies across the step is
    /// widened to the values on both of its sides.
    void phosphate_threshold() {
        const Ids inputs{"urine_phosphate", "serum_phosphate", "urine_creatinine", "serum_creatinine"};
        compute(
            "tmp_gfr", inputs,
            [](Values x, Context) { return chemistry::tmp_gfr(x[0], x[1], x[2], x[3] * umol_to_mmol); },
            "a phosphate excretion below the filtered load");
        const auto found = result_.known.find("tmp_gfr");
        if (steps_ != nullptr || found == result_.known.end() || found->second.origin != Origin::computed) {
            return;
        }
        Interval& value = found->second.value;
        const std::vector<Interval> box = box_of(inputs);
        const std::optional<Interval> reabsorbed = image_of_box(box, [](const std::vector<double>& x) {
            return chemistry::phosphate_reabsorption(x[0], x[1], x[2], x[3] * umol_to_mmol);
        });
        constexpr double step = chemistry::reabsorption_step;
        if (reabsorbed && reabsorbed->low <= step && step < reabsorbed->high) {
            const double above = 0.3 * step / (1.0 - 0.8 * step) * box[1].low;
            const double below = step * box[1].high;
            if (above < value.low) {
                value.low = above;
                value.low_open = true;
                value.low_is_floor = box[1].low_is_floor;
            }
            if (below > value.high) {
                value.high = below;
                value.high_open = false;
                value.high_is_ceiling = box[1].high_is_ceiling;
            }
        }
    }

    const Panel& panel_;
    FormulaContext context_;
    std::vector<DerivationStep>* steps_;
    Quantities result_;
};

}  // namespace

const QuantityValue* Quantities::find(std::string_view id) const noexcept {
    const auto found = known.find(id);
    return found == known.end() ? nullptr : &found->second;
}

Quantities derive(const Panel& panel, const ChemistrySettings& settings) {
    return Derivation(panel, settings).run();
}

Quantities detail::steps_to_derive(const Panel& panel, const ChemistrySettings& settings,
                                   std::vector<DerivationStep>& steps) {
    return Derivation(panel, settings, &steps).run();
}

}  // namespace steelyard::likelihoods
