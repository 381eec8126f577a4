// SPDX-License-Identifier: Apache-2.0
#include "gate_facts.hpp"

#include <algorithm>

namespace steelyard::likelihoods::detail {
namespace {

bool is_present(const Panel& panel, const std::string& feature) {
    const auto seen = panel.observed.find(feature);
    return !feature.empty() && seen != panel.observed.end() && seen->second.level == "present";
}

/// Why the GFR of this case is not valid; null when it is.
const std::string* why_gfr_is_barred(const Panel& panel, const GateSettings& settings) {
    for (const GfrCondition& condition : settings.gfr_conditions) {
        const auto seen = panel.observed.find(condition.feature);
        const bool barred = seen == panel.observed.end() ? condition.set_aside_when_unknown
                                                         : seen->second.level != condition.level;
        if (barred) {
            return &condition.otherwise;
        }
    }
    return nullptr;
}

}  // namespace

GateFacts gate_facts(const Panel& panel, const Quantities& quantities, const GateSettings& settings) {
    GateFacts facts;
    for (Known* known : {&facts.serum_bicarbonate, &facts.serum_total_co2, &facts.arterial_bicarbonate,
                         &facts.arterial_ph, &facts.arterial_pco2, &facts.venous_ph, &facts.expected_pco2,
                         &facts.gfr, &facts.anion_gap, &facts.anion_gap_corrected, &facts.delta_ratio,
                         &facts.serum_lactate, &facts.serum_beta_hydroxybutyrate}) {
        *known = Known(quantities, known->id());
    }
    facts.age = panel.age;
    facts.pregnant = is_present(panel, settings.pregnancy_feature);
    facts.given_alkali = is_present(panel, settings.alkali_feature);
    if (const QuantityValue* bicarbonate = quantities.find("serum_bicarbonate")) {
        const auto& from = bicarbonate->from;
        facts.bicarbonate_taken_from = from.empty() ? std::string_view() : std::string_view(from.front());
        facts.bicarbonate_from_total_co2 =
            std::find(from.begin(), from.end(), "serum_total_co2") != from.end();
    }
    facts.gfr_barred = why_gfr_is_barred(panel, settings);
    return facts;
}

}  // namespace steelyard::likelihoods::detail
