// SPDX-License-Identifier: Apache-2.0
// The limits of a clinic: `gate` and `urgent` of set.yaml. Every key of the gate must be there, so that a
// clinic sees each limit it works by.
#include <fmt/format.h>

#include <array>

#include "quantity_text.hpp"
#include "read_set_file.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Node;
using document::StrictMap;

namespace {

/// A key of `gate`: its unit, the range outside which it is a slip, and where its number goes.
struct GateKey {
    std::string_view key;
    std::string_view unit;  ///< UCUM; `1` for a plain number
    double low, high;
    Limit GateSettings::*limit;  ///< one of these two
    double ChemistrySettings::*coefficient;
};

constexpr Limit GateSettings::*no_limit = nullptr;
constexpr double ChemistrySettings::*no_coefficient = nullptr;

// Ranges are wide on purpose: they catch a wrong unit or a lost decimal point, not a clinic's judgement.
constexpr std::array<GateKey, 19> gate_keys = {{
    {"bicarbonate_low", "mmol/L", 10.0, 40.0, &GateSettings::bicarbonate_low, no_coefficient},
    {"ph_low", "[pH]", 7.0, 7.6, &GateSettings::ph_low, no_coefficient},
    {"ph_high", "[pH]", 7.2, 7.8, &GateSettings::ph_high, no_coefficient},
    {"gap_normal_to", "mmol/L", 0.0, 40.0, &GateSettings::gap_normal_to, no_coefficient},
    {"gap_high_from", "mmol/L", 0.0, 60.0, &GateSettings::gap_high_from, no_coefficient},
    {"gfr_reduced_below", "mL/min/{1.73_m2}", 1.0, 150.0, &GateSettings::gfr_reduced_below, no_coefficient},
    {"expected_pco2_band", "mm[Hg]", 0.0, 20.0, &GateSettings::expected_pco2_band, no_coefficient},
    {"gas_bicarbonate", "mmol/L", 0.0, 20.0, &GateSettings::gas_bicarbonate, no_coefficient},
    {"gas_ph", "[pH]", 0.0, 1.0, &GateSettings::gas_ph, no_coefficient},
    {"age_least", "a", 0.0, 120.0, &GateSettings::age_least, no_coefficient},
    {"pco2_high", "mm[Hg]", 20.0, 100.0, &GateSettings::pco2_high, no_coefficient},
    {"lactate_high", "mmol/L", 0.5, 30.0, &GateSettings::lactate_high, no_coefficient},
    {"ketones_high", "mmol/L", 0.1, 30.0, &GateSettings::ketones_high, no_coefficient},
    {"albumin_reference", "g/L", 20.0, 60.0, no_limit, &ChemistrySettings::albumin_reference},
    {"albumin_slope", "1", 0.0, 1.0, no_limit, &ChemistrySettings::albumin_slope},
    {"anion_gap_reference", "mmol/L", 0.0, 40.0, no_limit, &ChemistrySettings::anion_gap_reference},
    {"bicarbonate_reference", "mmol/L", 10.0, 40.0, no_limit, &ChemistrySettings::bicarbonate_reference},
    {"expected_pco2_slope", "1", 0.0, 5.0, no_limit, &ChemistrySettings::expected_pco2_slope},
    {"expected_pco2_intercept", "mm[Hg]", -20.0, 40.0, no_limit, &ChemistrySettings::expected_pco2_intercept},
}};

/// The molar mass of no single substance: amounts and equivalents of the univalent ions of these gaps are the
/// same.
constexpr Substance univalent{0.0, 1};

std::optional<double> read_gate_value(const Node& node, const std::string& what, const GateKey& key,
                                      Diagnostics& faults) {
    // Coefficients of formulas are plain numbers by custom; a unit is accepted where it has one.
    const QuantityRange range{key.key, key.unit, univalent, key.low, key.high};
    if (key.coefficient != no_coefficient && node.kind == document::Kind::scalar) {
        if (const std::optional<double> number = document::number_from(node.text)) {
            const Node& scalar = node;
            if (!(key.low <= *number && *number <= key.high)) {
                faults.add(scalar.where(), Code::implausible_value,
                           fmt::format("{} is {}, outside the plausible range {} to {}", what, *number,
                                       key.low, key.high));
                return std::nullopt;
            }
            return number;
        }
    }
    return read_quantity(node, what, range, faults);
}

void read_gate_key(const Node& node, const GateKey& key, TableSet& set, Diagnostics& faults) {
    StrictMap map(node, fmt::format("gate.{}", key.key), faults);
    const Node* value_node = map.required("value");
    std::optional<document::Grounds> grounds;
    if (map.usable()) {
        grounds = document::read_grounds(map, set.sources, true, faults);
    }
    const std::string note = map.optional_text("note").value_or("");
    map.finish();
    if (value_node == nullptr) {
        return;
    }
    const std::optional<double> value = read_gate_value(*value_node, map.name("value"), key, faults);
    if (!value || !grounds) {
        return;
    }
    set.gate_entries.push_back({std::string(key.key), value_node->text, *grounds, note});
    if (key.limit != no_limit) {
        set.gate.*key.limit = Limit{*value, *grounds};
    } else {
        set.gate.chemistry.*key.coefficient = *value;
    }
}

/// A feature of the set that can be `present`; bad_gate at the node otherwise. `none` says openly that the
/// set has no such feature, and gives an empty name.
std::string read_feature_name(const Node& node, const std::string& what, const TableSet& set,
                              Diagnostics& faults) {
    const std::optional<std::string> id = document::read_identifier(node, what, faults);
    if (!id || *id == "none") {
        return {};
    }
    const FeatureVocabulary vocabulary = set.vocabulary();
    const auto found = vocabulary.levels.find(*id);
    if (found == vocabulary.levels.end()) {
        std::vector<std::string> known;
        for (const auto& [name, levels] : vocabulary.levels) {
            known.push_back(name);
        }
        faults.add(node.where(), Code::bad_gate, fmt::format("{}: {} is no feature of this set", what, *id),
                   name_hint(*id, known));
        return {};
    }
    if (!contains(found->second, "present")) {
        faults.add(node.where(), Code::bad_gate, fmt::format("{}: {} has no level `present`", what, *id),
                   "name a feature whose levels are present and absent");
        return {};
    }
    return *id;
}

/// What makes a GFR invalid for its own table makes it invalid for the gate.
void take_gfr_conditions(TableSet& set) {
    const EvidenceTable* table = set.find_table("gfr");
    if (table == nullptr) {
        return;
    }
    for (const Condition& condition : table->usable_when) {
        if (condition.is_feature) {
            set.gate.gfr_conditions.push_back(
                {condition.subject, condition.level, condition.otherwise, condition.set_aside_when_unknown});
        }
    }
}

}  // namespace

void read_gate(const Node& node, TableSet& set, Diagnostics& faults) {
    const std::size_t before = faults.size();
    take_gfr_conditions(set);
    StrictMap map(node, "gate", faults);
    for (const GateKey& key : gate_keys) {
        if (const Node* entry = map.required(key.key)) {
            read_gate_key(*entry, key, set, faults);
        }
    }
    if (const Node* alkali = map.required("alkali_feature")) {
        set.gate.alkali_feature = read_feature_name(*alkali, "gate.alkali_feature", set, faults);
    }
    if (const Node* pregnancy = map.optional("pregnancy_feature")) {
        set.gate.pregnancy_feature = read_feature_name(*pregnancy, "gate.pregnancy_feature", set, faults);
    }
    map.finish();
    if (faults.size() != before || !map.usable()) {
        return;
    }
    if (set.gate.ph_low.value >= set.gate.ph_high.value) {
        faults.add(node.where(), Code::bad_gate, "gate.ph_low must be below gate.ph_high");
    }
    if (set.gate.gap_normal_to.value > set.gate.gap_high_from.value) {
        faults.add(node.where(), Code::bad_gate, "gate.gap_normal_to must not be above gate.gap_high_from");
    }
}

void read_urgent(const Node& node, TableSet& set, Diagnostics& faults) {
    std::size_t number = 0;
    for (const Node& item : items_of(node, "urgent", faults)) {
        ++number;
        StrictMap map(item, fmt::format("urgent[{}]", number), faults);
        const Node* quantity_node = map.required("quantity");
        const Node* low = map.optional("low");
        const Node* high = map.optional("high");
        UrgentLimit limit;
        if (map.usable()) {
            limit.grounds =
                document::read_grounds(map, set.sources, true, faults).value_or(document::Grounds{});
        }
        static_cast<void>(map.optional_text("note"));  // for those who keep the file
        map.finish();
        if (quantity_node == nullptr) {
            continue;
        }
        const std::optional<std::string> id =
            document::read_identifier(*quantity_node, map.name("quantity"), faults);
        if (!id) {
            continue;
        }
        const std::optional<QuantityRange> range = describe_quantity(*id);
        if (!range) {
            faults.add(quantity_node->where(), Code::unknown_quantity,
                       fmt::format("{}: {} is no quantity this program knows", map.name("quantity"), *id),
                       name_hint(*id, quantity_ids()));
            continue;
        }
        limit.quantity = *id;
        if (low == nullptr && high == nullptr) {
            faults.add(item.where(), Code::missing_key,
                       fmt::format("{} needs `low`, `high` or both", map.what()));
        }
        if (low != nullptr) {
            limit.low = read_quantity(*low, map.name("low"), *range, faults);
        }
        if (high != nullptr) {
            limit.high = read_quantity(*high, map.name("high"), *range, faults);
        }
        if (limit.low && limit.high && *limit.low >= *limit.high) {
            faults.add(high->where(), Code::bad_limit, fmt::format("{}: low must be below high", map.what()));
        }
        set.urgent.push_back(std::move(limit));
    }
}

}  // namespace steelyard::likelihoods::detail
