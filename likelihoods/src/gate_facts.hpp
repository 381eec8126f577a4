// SPDX-License-Identifier: Apache-2.0
#pragma once
// All that the gate looks at, laid out so that it can be asked for its status alone, without its reasons.

#include <optional>
#include <string>
#include <string_view>

#include "known_quantity.hpp"
#include "steelyard/likelihoods/gate.hpp"

namespace steelyard::likelihoods::detail {

struct GateFacts {
    Known serum_bicarbonate{"serum_bicarbonate"};
    Known serum_total_co2{"serum_total_co2"};
    Known arterial_bicarbonate{"arterial_bicarbonate"};
    Known arterial_ph{"arterial_ph"};
    Known arterial_pco2{"arterial_pco2"};
    Known venous_ph{"venous_ph"};
    Known expected_pco2{"expected_pco2"};
    Known gfr{"gfr"};
    Known anion_gap{"anion_gap"};
    Known anion_gap_corrected{"anion_gap_corrected"};
    Known delta_ratio{"delta_ratio"};
    Known serum_lactate{"serum_lactate"};
    Known serum_beta_hydroxybutyrate{"serum_beta_hydroxybutyrate"};
    std::optional<double> age;  ///< [a]
    bool pregnant = false;
    bool given_alkali = false;
    std::string_view bicarbonate_taken_from;  ///< the first analyte a computed bicarbonate was computed from
    bool bicarbonate_from_total_co2 = false;
    const std::string* gfr_barred = nullptr;  ///< why the GFR of this case is not valid; null when it is
};

GateFacts gate_facts(const Panel& panel, const Quantities& quantities, const GateSettings& settings);

GateStatus gate_status(const GateFacts& facts, const GateSettings& settings);

}  // namespace steelyard::likelihoods::detail
