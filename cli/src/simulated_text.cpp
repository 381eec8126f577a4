// SPDX-License-Identifier: Apache-2.0
// Simulated cases as CSV, YAML and NDJSON. All texts are the program's own words and numbers, and the
// identifiers of a table set.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <string_view>

#include "simulation.hpp"
#include "steelyard/cli/csv_text.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::Panel;
using likelihoods::PanelEntry;

constexpr std::array<std::string_view, 5> measured_sections = {"serum", "plasma", "arterial", "venous",
                                                               "urine"};

std::string_view sex_of(const Panel& panel) {
    return panel.sex == likelihoods::Sex::female ? "female" : "male";
}

/// The value of an entry as text, without its unit; empty when the panel has none.
std::string_view text_of(const Panel& panel, const PanelEntry& entry) {
    for (const auto* readings : {&panel.measured, &panel.given}) {
        if (const auto found = readings->find(entry.name); found != readings->end()) {
            return found->second.as_read;
        }
    }
    const auto seen = panel.observed.find(entry.name);
    return seen == panel.observed.end() ? std::string_view{} : std::string_view(seen->second.level);
}

std::string with_unit(std::string_view value, const PanelEntry& entry) {
    return entry.unit.empty() ? std::string(value) : fmt::format("{} {}", value, entry.unit);
}

/// Where an entry stands in a case file, and its name there.
struct Place {
    std::string_view section, name;
};

Place place_of(const Panel& panel, const PanelEntry& entry) {
    if (panel.given.contains(entry.name)) {
        return {"derived", entry.name};
    }
    if (panel.observed.contains(entry.name)) {
        return {"observed", entry.name};
    }
    const std::size_t end = entry.name.find('_');
    return {std::string_view(entry.name).substr(0, end), std::string_view(entry.name).substr(end + 1)};
}

/// Quotes what YAML would take for something else inside braces.
std::string yaml_scalar(const std::string& text) {
    const bool plain =
        text.find_first_not_of("ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789._/ -") ==
        std::string::npos;
    return plain && !text.starts_with('-') ? text : fmt::format("\"{}\"", text);
}

/// Calls `add(section, name, value)` for each entry of a panel, section by section.
template <class Add>
void for_each_entry(const Panel& panel, const std::vector<PanelEntry>& entries, const Add& add) {
    const auto of_section = [&](std::string_view section) {
        for (const PanelEntry& entry : entries) {
            const std::string_view value = text_of(panel, entry);
            if (value.empty()) {
                continue;
            }
            const Place place = place_of(panel, entry);
            if (place.section == section) {
                add(section, place.name, with_unit(value, entry));
            }
        }
    };
    std::for_each(measured_sections.begin(), measured_sections.end(), of_section);
    of_section("derived");
    of_section("observed");
}

}  // namespace

std::string simulated_csv_header(const std::vector<PanelEntry>& entries) {
    std::string text = "case,sex,age [a]";
    for (const PanelEntry& entry : entries) {
        text +=
            "," + csv_field(entry.unit.empty() ? entry.name : fmt::format("{} [{}]", entry.name, entry.unit));
    }
    return text + ",final_cause\n";
}

void add_simulated_csv(const Panel& panel, const std::vector<PanelEntry>& entries, std::string& text) {
    text += panel.case_id;
    text += ',';
    text += panel.sex == likelihoods::Sex::unknown ? std::string_view{} : sex_of(panel);
    text += fmt::format(",{:.0f}", panel.age.value_or(0.0));
    for (const PanelEntry& entry : entries) {
        text += ',';
        text += text_of(panel, entry);
    }
    text += ',';
    text += panel.final_cause.value_or("");
    text += '\n';
}

void add_simulated_yaml(const Panel& panel, const std::vector<PanelEntry>& entries, std::string& text) {
    text += fmt::format("- case: {}\n", panel.case_id);
    if (panel.sex != likelihoods::Sex::unknown) {
        text += fmt::format("  sex: {}\n", sex_of(panel));
    }
    text += fmt::format("  age: {:.0f} a\n", panel.age.value_or(0.0));
    std::string_view open;
    for_each_entry(
        panel, entries, [&](std::string_view section, std::string_view name, const std::string& value) {
            text += section == open ? ", " : fmt::format("{}  {}: {{", open.empty() ? "" : "}\n", section);
            open = section;
            text += fmt::format("{}: {}", name, yaml_scalar(value));
        });
    text += open.empty() ? "" : "}\n";
    text += fmt::format("  final_cause: {}\n", panel.final_cause.value_or(""));
}

void add_simulated_ndjson(const Panel& panel, const std::vector<PanelEntry>& entries, std::string& text) {
    text += fmt::format("{{\"case\":\"{}\"", panel.case_id);
    if (panel.sex != likelihoods::Sex::unknown) {
        text += fmt::format(",\"sex\":\"{}\"", sex_of(panel));
    }
    text += fmt::format(",\"age\":\"{:.0f} a\"", panel.age.value_or(0.0));
    std::string_view open;
    for_each_entry(
        panel, entries, [&](std::string_view section, std::string_view name, const std::string& value) {
            text += section == open ? "," : fmt::format("{},\"{}\":{{", open.empty() ? "" : "}", section);
            open = section;
            text += fmt::format("\"{}\":\"{}\"", name, value);
        });
    text += open.empty() ? "" : "}";
    text += fmt::format(",\"final_cause\":\"{}\"}}\n", panel.final_cause.value_or(""));
}

}  // namespace steelyard::cli
