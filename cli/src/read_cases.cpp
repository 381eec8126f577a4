// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/read_cases.hpp"

#include <fmt/format.h>

#include <array>
#include <map>

#include "open_inputs.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/document/node.hpp"
#include "steelyard/document/strict_map.hpp"
#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::cli {
namespace {

using document::Code;
using document::Diagnostics;
using document::Node;
using likelihoods::Panel;
using likelihoods::PanelBuilder;

/// Sections of a case; `derived` and `observed` hold names of their own, the others prefix theirs.
constexpr std::array<std::string_view, 7> sections = {"serum", "plasma",  "arterial", "venous",
                                                      "urine", "derived", "observed"};

std::string feature_hint(const std::string& word, const likelihoods::FeatureVocabulary& vocabulary) {
    std::vector<std::string> known;
    for (const auto& [feature, levels] : vocabulary.levels) {
        known.push_back(feature);
    }
    return suggestion(word, known).substr(2);
}

void read_section(const Node& node, std::string_view section,
                  const likelihoods::FeatureVocabulary& vocabulary, PanelBuilder& builder,
                  Diagnostics& faults) {
    if (node.kind != document::Kind::mapping) {
        faults.add(node.where(), Code::wrong_type,
                   fmt::format("{} must be a mapping of names to values", section),
                   fmt::format("write {}: {{name: value unit, ...}}", section));
        return;
    }
    const bool prefixed = section != "derived" && section != "observed";
    for (const document::Entry& entry : node.entries) {
        const std::string name = prefixed ? fmt::format("{}_{}", section, entry.key) : entry.key;
        if (entry.value.kind != document::Kind::scalar) {
            faults.add(entry.value.where(), Code::wrong_type,
                       fmt::format("{}.{} must be a single value with its unit", section, visible(entry.key)),
                       "write it as in 2.8 mmol/L");
        } else if (entry.value.is_null()) {
            faults.add(entry.value.where(), Code::empty_value,
                       fmt::format("{}.{} has no value", section, visible(entry.key)),
                       "leave the line out when the value is not known");
        } else if (section == "derived" && likelihoods::find_derived(entry.key) == nullptr) {
            faults.add(
                {*node.file, entry.line, entry.column}, Code::unknown_analyte,
                fmt::format("{} is no derived quantity", visible(entry.key)),
                "measured values stand under serum, plasma, arterial, venous or urine; see docs/formats.md");
        } else if (section == "observed" && !vocabulary.levels.contains(entry.key)) {
            const bool measured = likelihoods::find_quantity(entry.key) != nullptr;
            faults.add({*node.file, entry.line, entry.column}, Code::unknown_feature,
                       fmt::format("{} is no feature of this table set", visible(entry.key)),
                       measured ? "it is a measured value: write it under its section"
                                : feature_hint(entry.key, vocabulary));
        } else {
            builder.set(name, entry.value.text, entry.value.where());
        }
    }
}

std::optional<Panel> read_case(const Node& node, const likelihoods::FeatureVocabulary& vocabulary,
                               Diagnostics& faults) {
    const std::size_t before = faults.size();
    document::StrictMap map(node, "", faults);
    if (!map.usable()) {
        return std::nullopt;
    }
    PanelBuilder builder(vocabulary, faults);
    const auto id = map.required_text("case");
    builder.start(id.value_or(""), node.where());
    for (const std::string_view key : {"sex", "age", "final_cause"}) {
        if (const Node* value = map.optional(key)) {
            if (value->kind != document::Kind::scalar) {
                faults.add(value->where(), Code::wrong_type, fmt::format("{} must be a single value", key));
            } else {
                builder.set(key, value->text, value->where());
            }
        }
    }
    for (const std::string_view section : sections) {
        if (const Node* value = map.optional(section)) {
            read_section(*value, section, vocabulary, builder, faults);
        }
    }
    map.finish();
    Panel panel = builder.finish();
    if (faults.size() != before) {
        return std::nullopt;
    }
    return panel;
}

}  // namespace

std::vector<Panel> read_cases(std::string_view text, const std::string& file,
                              const likelihoods::FeatureVocabulary& vocabulary, Diagnostics& faults) {
    std::vector<Panel> panels;
    const auto tree = document::parse(text, file, document::syntax_of(file, text), faults);
    if (!tree) {
        return panels;
    }
    const auto keep = [&](const Node& node) {
        if (auto panel = read_case(node, vocabulary, faults)) {
            panels.push_back(std::move(*panel));
        }
    };
    if (tree->kind == document::Kind::sequence) {
        if (tree->items.empty()) {
            faults.add(tree->where(), Code::empty_document, "the list holds no case",
                       "give at least one case");
        }
        for (const Node& item : tree->items) {
            keep(item);
        }
    } else {
        keep(*tree);
    }
    return panels;
}

std::vector<Panel> load_cases(const std::vector<std::string>& paths,
                              const likelihoods::FeatureVocabulary& vocabulary, Diagnostics& faults,
                              const std::string* standard_input) {
    std::vector<Panel> all;
    std::map<std::string, document::SourcePosition> seen;
    for (const std::string& path : paths) {
        const auto text = path == "-" && standard_input != nullptr ? std::optional(*standard_input)
                                                                   : document::read_text(path, faults);
        if (!text) {
            continue;
        }
        for (Panel& panel : read_cases(*text, path, vocabulary, faults)) {
            const auto [first, is_new] = seen.emplace(panel.case_id, panel.where);
            if (!is_new) {
                faults.add(panel.where, Code::conflicting_values,
                           fmt::format("the case {} was given before, at {}", visible(panel.case_id),
                                       document::to_string(first->second)),
                           "give each case a name of its own, and each file once");
            }
            all.push_back(std::move(panel));
        }
    }
    return all;
}

}  // namespace steelyard::cli
