// SPDX-License-Identifier: Apache-2.0
#include "quantity_text.hpp"

#include <fmt/format.h>

#include "steelyard/likelihoods/analyte.hpp"
#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Node;

std::optional<QuantityRange> describe_quantity(std::string_view id) {
    if (const Analyte* analyte = find_analyte(id)) {
        return QuantityRange{analyte->title, analyte->unit, analyte->substance, analyte->plausible_low,
                             analyte->plausible_high};
    }
    if (const DerivedQuantity* derived = find_derived(id)) {
        return QuantityRange{derived->title, derived->unit, derived->substance, derived->plausible_low,
                             derived->plausible_high};
    }
    return std::nullopt;
}

std::vector<std::string> quantity_ids() {
    std::vector<std::string> ids;
    for (const Analyte& analyte : analytes()) {
        ids.emplace_back(analyte.id);
    }
    for (const DerivedQuantity& derived : derived_quantities()) {
        ids.emplace_back(derived.id);
    }
    return ids;
}

bool unit_may_be_omitted(std::string_view canonical_unit) {
    const std::optional<Unit> unit = read_unit(canonical_unit).unit;
    return unit && (unit->dimension == Dimension::ph || unit->dimension == Dimension::ratio);
}

std::optional<double> read_unit_factor(const Node& node, std::string_view what, std::string_view unit_text,
                                       const QuantityRange& quantity, Diagnostics& faults) {
    const UnitReading reading = read_unit(unit_text);
    const std::string hint = fmt::format("write {}, or a unit that converts to it", quantity.unit);
    if (!reading.unit) {
        faults.add(node.where(), Code::bad_unit,
                   reading.why_not.empty()
                       ? fmt::format("{}: \"{}\" is no unit this program knows", what, unit_text)
                       : fmt::format("{}: {}", what, reading.why_not),
                   hint);
        return std::nullopt;
    }
    const std::optional<Unit> canonical = read_unit(quantity.unit).unit;
    const std::optional<double> factor =
        canonical ? conversion_factor(*reading.unit, *canonical, quantity.substance) : std::nullopt;
    if (!factor) {
        faults.add(node.where(), Code::bad_unit,
                   fmt::format("{}: {} does not convert to {}, the unit of {}", what, unit_text,
                               quantity.unit, quantity.title),
                   hint);
    }
    return factor;
}

std::optional<double> read_quantity(const Node& node, std::string_view what, const QuantityRange& quantity,
                                    Diagnostics& faults) {
    const std::optional<std::string> text = document::read_text_value(node, what, faults);
    if (!text) {
        return std::nullopt;
    }
    constexpr std::string_view blanks = " \t";
    const std::string_view all = *text;
    const std::size_t begin = std::min(all.find_first_not_of(blanks), all.size());
    const std::size_t gap = std::min(all.find_first_of(blanks, begin), all.size());
    const std::size_t unit_at = std::min(all.find_first_not_of(blanks, gap), all.size());
    std::string_view unit = all.substr(unit_at);
    if (const std::size_t last = unit.find_last_not_of(blanks); last != std::string_view::npos) {
        unit = unit.substr(0, last + 1);
    }
    const std::optional<double> number = document::number_from(all.substr(begin, gap - begin));
    if (!number) {
        faults.add(node.where(), Code::not_a_number,
                   fmt::format("{}: \"{}\" does not begin with a number", what, all),
                   fmt::format("write a number, a space and a unit, as in: 25 {}", quantity.unit));
        return std::nullopt;
    }
    double factor = 1.0;
    if (unit.empty()) {
        if (!unit_may_be_omitted(quantity.unit)) {
            faults.add(node.where(), Code::bad_unit, fmt::format("{} has no unit", what),
                       fmt::format("write the unit after the number, as in: {} {}",
                                   all.substr(begin, gap - begin), quantity.unit));
            return std::nullopt;
        }
    } else {
        const std::optional<double> read = read_unit_factor(node, what, unit, quantity, faults);
        if (!read) {
            return std::nullopt;
        }
        factor = *read;
    }
    const double value = *number * factor;
    if (!(quantity.low <= value && value <= quantity.high)) {
        faults.add(node.where(), Code::implausible_value,
                   fmt::format("{} is {:.6g} {}, outside the plausible range {:.6g} to {:.6g} of {}", what,
                               value, quantity.unit, quantity.low, quantity.high, quantity.title),
                   "check the number and its unit");
        return std::nullopt;
    }
    return value;
}

}  // namespace steelyard::likelihoods::detail
