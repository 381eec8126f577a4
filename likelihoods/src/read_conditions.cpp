// SPDX-License-Identifier: Apache-2.0
// `usable_when`: the conditions under which a table may be read.
#include <fmt/format.h>

#include <array>

#include "read_table_file.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Node;
using document::StrictMap;

namespace {

void read_bounds(StrictMap& map, const Node& item, const Node& subject, Condition& condition,
                 Diagnostics& faults) {
    struct Bound {
        std::string_view key;
        std::optional<double> Condition::*member;
    };
    constexpr std::array<Bound, 4> bounds = {{{"at_least", &Condition::at_least},
                                              {"above", &Condition::above},
                                              {"at_most", &Condition::at_most},
                                              {"below", &Condition::below}}};
    std::array<const Node*, 4> given{};
    for (std::size_t i = 0; i < bounds.size(); ++i) {
        given.at(i) = map.optional(bounds.at(i).key);
    }
    if (condition.subject.empty()) {
        return;  // already reported
    }
    const std::optional<QuantityRange> quantity = describe_quantity(condition.subject);
    if (!quantity) {
        faults.add(
            subject.where(), Code::unknown_quantity,
            fmt::format("{}: {} is no quantity this program knows", map.name("quantity"), condition.subject),
            name_hint(condition.subject, quantity_ids()));
        return;
    }
    bool any = false;
    for (std::size_t i = 0; i < bounds.size(); ++i) {
        if (given.at(i) != nullptr) {
            any = true;
            condition.*(bounds.at(i).member) =
                read_quantity(*given.at(i), map.name(bounds.at(i).key), *quantity, faults);
        }
    }
    if (!any) {
        faults.add(item.where(), Code::missing_key, fmt::format("{} has no limit", map.what()),
                   "give at_least, at_most, above or below");
    }
    if ((given[0] != nullptr && given[1] != nullptr) || (given[2] != nullptr && given[3] != nullptr)) {
        faults.add(item.where(), Code::conflicting_keys,
                   fmt::format("{} has two limits on the same side", map.what()));
        return;
    }
    const std::optional<double> low = condition.at_least ? condition.at_least : condition.above;
    const std::optional<double> high = condition.at_most ? condition.at_most : condition.below;
    if (low && high && *low >= *high) {
        faults.add(item.where(), Code::bad_limit,
                   fmt::format("{}: the lower limit is not below the upper", map.what()));
    }
}

void read_level(StrictMap& map, const Node& subject, const SetNames& names, Condition& condition,
                Diagnostics& faults) {
    const Node* is = map.required("is");
    if (condition.subject.empty()) {
        return;  // already reported
    }
    const auto feature = names.vocabulary.levels.find(condition.subject);
    if (feature == names.vocabulary.levels.end() && names.features_known) {
        std::vector<std::string> known;
        for (const auto& [name, levels] : names.vocabulary.levels) {
            known.push_back(name);
        }
        const std::string hint = name_hint(condition.subject, known);
        faults.add(subject.where(), Code::unknown_feature,
                   fmt::format("{}: {} is no feature of this set", map.name("feature"), condition.subject),
                   hint.empty() ? "list it under `features` of set.yaml" : hint);
    }
    if (is == nullptr) {
        return;
    }
    condition.level = document::read_identifier(*is, map.name("is"), faults).value_or("");
    if (!condition.level.empty() && feature != names.vocabulary.levels.end() &&
        !contains(feature->second, condition.level)) {
        faults.add(
            is->where(), Code::bad_level,
            fmt::format("{}: {} is no level of {}", map.name("is"), condition.level, condition.subject),
            name_hint(condition.level, feature->second));
    }
}

}  // namespace

std::vector<Condition> read_conditions(const Node& node, const SetNames& names,
                                       const document::Sources& sources, Diagnostics& faults) {
    constexpr std::array<std::string_view, 2> when_unknown = {"read", "set_aside"};
    std::vector<Condition> conditions;
    for (const Node& item : items_of(node, "usable_when", faults)) {
        StrictMap map(item, fmt::format("usable_when[{}]", conditions.size() + 1), faults);
        Condition condition;
        const Node* quantity = map.optional("quantity");
        const Node* feature = map.optional("feature");
        if (map.usable() && (quantity != nullptr) == (feature != nullptr)) {
            faults.add(item.where(), quantity == nullptr ? Code::missing_key : Code::conflicting_keys,
                       fmt::format("{} must name one `quantity` or one `feature`", map.what()));
            quantity = nullptr;
            feature = nullptr;
            // The other keys depend on which it is; do not call them unknown.
            for (const std::string_view key : {"at_least", "above", "at_most", "below", "is"}) {
                static_cast<void>(map.optional(key));
            }
        }
        if (const Node* subject = quantity != nullptr ? quantity : feature) {
            condition.is_feature = feature != nullptr;
            condition.subject = document::read_identifier(
                                    *subject, map.name(condition.is_feature ? "feature" : "quantity"), faults)
                                    .value_or("");
            if (condition.is_feature) {
                read_level(map, *subject, names, condition, faults);
            } else {
                read_bounds(map, item, *subject, condition, faults);
            }
        }
        condition.otherwise = map.required_text("else").value_or("");
        condition.set_aside_when_unknown =
            map.optional_choice("when_unknown", when_unknown).value_or("read") == "set_aside";
        if (map.usable() && (item.find("basis") != nullptr || item.find("source") != nullptr)) {
            condition.grounds = document::read_grounds(map, sources, true, faults);
        }
        map.finish();
        conditions.push_back(std::move(condition));
    }
    return conditions;
}

}  // namespace steelyard::likelihoods::detail
