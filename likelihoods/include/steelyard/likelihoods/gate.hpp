// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether the question applies at all: is this a metabolic acidosis, is its gap normal, is the blood gas
// consistent? Limits are the clinic's (`gate` and `urgent` in set.yaml), each with basis and source.

#include <optional>
#include <string>
#include <vector>

#include "steelyard/document/sources.hpp"
#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods {

/// One limit of a clinic, in the canonical unit of what it limits.
struct Limit {
    double value = 0.0;
    document::Grounds grounds;
};

/// A feature without which a GFR is not valid: a condition of the table `gfr`.
struct GfrCondition {
    std::string feature;
    std::string level;                    ///< the level it must have
    std::string otherwise;                ///< the reason when it has another
    bool set_aside_when_unknown = false;  ///< whether a feature that is not given bars the GFR too
};

struct GateSettings {
    ChemistrySettings chemistry;
    Limit bicarbonate_low;          ///< a bicarbonate at or above this is no acidosis [mmol/L]
    Limit ph_low;                   ///< an arterial pH below this is acidaemia
    Limit ph_high;                  ///< an arterial pH above this is alkalaemia
    Limit gap_normal_to;            ///< corrected anion gap up to this is normal [mmol/L]
    Limit gap_high_from;            ///< above this it is high [mmol/L]
    Limit gfr_reduced_below;        ///< a GFR below this can itself raise the gap [mL/min/{1.73_m2}]
    Limit expected_pco2_band;       ///< pCO2 within this of the expected is compensation [mm[Hg]]
    Limit gas_bicarbonate;          ///< tolerated disagreement of bicarbonate with pH and pCO2 [mmol/L]
    Limit gas_ph;                   ///< the same in pH; a gas is inconsistent when both are exceeded
    Limit age_least;                ///< the tables are for adults [a]
    Limit pco2_high;                ///< an arterial pCO2 above this is hypercapnia [mm[Hg]]
    Limit lactate_high;             ///< above this, with a high gap, it is a lactic acidosis [mmol/L]
    Limit ketones_high;             ///< beta-hydroxybutyrate above this is a ketoacidosis likewise [mmol/L]
    std::string alkali_feature;     ///< feature which says that alkali is being given; empty for none
    std::string pregnancy_feature;  ///< feature which says that she is pregnant; empty for none
    std::vector<GfrCondition> gfr_conditions;  ///< from the set's table `gfr`; empty when it has none
};

enum class GateStatus { in_scope, caution, out_of_scope };
std::string_view to_string(GateStatus status) noexcept;

struct GateResult {
    GateStatus status = GateStatus::in_scope;
    std::vector<std::string> reasons;  ///< in words, the gravest first; at least one
    /// What was computed, in canonical units: anion_gap, anion_gap_corrected, expected_pco2, delta_ratio, ...
    std::vector<std::pair<std::string, double>> quantities;
};

GateResult gate(const Panel& panel, const Quantities& quantities, const GateSettings& settings);

/// The ids of all quantities and features that the gate looks at.
std::vector<std::string> gate_inputs(const GateSettings& settings);

/// A limit at which the laboratory would telephone.
struct UrgentLimit {
    std::string quantity;
    std::optional<double> low, high;  ///< canonical unit; a value at or beyond the limit is urgent
    document::Grounds grounds;
};

struct UrgentValue {
    std::string quantity;
    /// The point, the bound that was measured, or of a computed interval the end that matters: the one
    /// nearest the limit when certain, the one beyond it when not [unit].
    double value = 0.0;
    std::string_view unit;  ///< canonical UCUM
    double limit = 0.0;
    bool is_low = false;
    document::Grounds grounds;
    Interval interval;    ///< all that is known of the value [unit]
    std::string shown;    ///< the same in words without unit, with the decimals of the limit: `below 2.0`
    bool certain = true;  ///< false: the interval reaches the limit but does not lie beyond it
};

/// Urgent values of a panel, in the order of the limits; computed whatever the gate says. A censored value is
/// certain when all of its interval lies at or beyond the limit. A value that only restates another one (a
/// bicarbonate taken from total CO2) has no line beside it.
std::vector<UrgentValue> urgent_values(const Quantities& quantities, const std::vector<UrgentLimit>& limits);

}  // namespace steelyard::likelihoods
