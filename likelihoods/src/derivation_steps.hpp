// SPDX-License-Identifier: Apache-2.0
#pragma once
// What derive() would compute for a panel, as a list of steps: so that many panels of the same entries can be
// computed one after another without asking again what each of them lacks.

#include <string_view>
#include <vector>

#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods::detail {

/// What formulas need beside their inputs.
struct FormulaContext {
    ChemistrySettings settings;
    double age = 0.0;     ///< [a]
    bool female = false;  ///< for the filtration rate
};
using PointFormula = double (*)(const double* inputs, const FormulaContext& context);

struct DerivationStep {
    std::string_view id;                   ///< what is computed
    std::vector<std::string_view> inputs;  ///< known or computed before
    PointFormula formula = nullptr;        ///< not finite outside its domain
};

/// The steps of derive() for panels in which the same things are known as in this one, whatever their values,
/// provided that every formula has a value.
/// @returns  the quantities with their origins; their values mean nothing
Quantities steps_to_derive(const Panel& panel, const ChemistrySettings& settings,
                           std::vector<DerivationStep>& steps);

}  // namespace steelyard::likelihoods::detail
