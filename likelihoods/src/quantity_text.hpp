// SPDX-License-Identifier: Apache-2.0
#pragma once
// Reading `25 mmol/L` in a table set: a number, a unit that converts to the canonical one, within the
// plausible range.

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/strict_map.hpp"
#include "steelyard/likelihoods/unit.hpp"

namespace steelyard::likelihoods::detail {

/// What is needed to read a value of a quantity: the canonical unit, the substance and the plausible range.
struct QuantityRange {
    std::string_view title;
    std::string_view unit;  ///< canonical, UCUM
    Substance substance;
    double low = 0.0, high = 0.0;  ///< [canonical unit]
};

/// Of an analyte or a derived quantity; empty when the id is neither.
std::optional<QuantityRange> describe_quantity(std::string_view id);

/// The ids of all analytes and derived quantities, for the nearest name.
std::vector<std::string> quantity_ids();

/// A pH and a plain ratio have no unit to confuse, so theirs may be left out.
bool unit_may_be_omitted(std::string_view canonical_unit);

/// The factor from a unit as written to the canonical unit; bad_unit at the node otherwise.
std::optional<double> read_unit_factor(const document::Node& node, std::string_view what,
                                       std::string_view unit_text, const QuantityRange& quantity,
                                       document::Diagnostics& faults);

/// A number with unit in canonical units; not_a_number, bad_unit or implausible_value at the node otherwise.
std::optional<double> read_quantity(const document::Node& node, std::string_view what,
                                    const QuantityRange& quantity, document::Diagnostics& faults);

}  // namespace steelyard::likelihoods::detail
