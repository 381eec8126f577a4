// SPDX-License-Identifier: Apache-2.0
#include "read_set_file.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <map>

#include "quantity_text.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Entry;
using document::Node;
using document::StrictMap;

namespace {

/// The part named at a key of a composite; bad_composite when it is none of the composite's parts.
std::optional<std::string> read_part(const Node& node, const std::string& what,
                                     const std::vector<std::string>& parts, Diagnostics& faults) {
    std::optional<std::string> part = document::read_identifier(node, what, faults);
    if (part && !parts.empty() && !contains(parts, *part)) {
        faults.add(node.where(), Code::bad_composite, fmt::format("{}: {} is none of the parts", what, *part),
                   name_hint(*part, parts));
        return std::nullopt;
    }
    return part;
}

void read_composite(StrictMap& map, const Node* parts, Cause& cause, std::size_t index, SetFile& file,
                    std::vector<PlacedText>& named_parts, Diagnostics& faults) {
    const Node* takes = map.optional("takes");
    if (parts == nullptr) {
        const Node* otherwise = map.optional("otherwise");
        for (const Node* stray : {takes, otherwise}) {
            if (stray != nullptr) {
                faults.add(stray->where(), Code::bad_composite,
                           fmt::format("{} says whose rows it takes but has no parts", map.what()),
                           "name its parts, or give it rows of its own");
            }
        }
        return;
    }
    for (PlacedText& part : read_identifiers(*parts, map.name("parts"), faults)) {
        if (contains(cause.parts, part.text)) {
            faults.add(part.where, Code::bad_composite,
                       fmt::format("{} names {} twice", map.name("parts"), part.text));
            continue;
        }
        cause.parts.push_back(part.text);
        named_parts.push_back(std::move(part));
    }
    if (cause.parts.size() < 2) {
        faults.add(parts->where(), Code::bad_composite,
                   fmt::format("{} needs at least two parts", map.what()));
    }
    if (const Node* otherwise = map.required("otherwise")) {
        cause.otherwise = read_part(*otherwise, map.name("otherwise"), cause.parts, faults).value_or("");
    }
    if (takes != nullptr) {
        for (const Entry& entry : entries_of(*takes, map.name("takes"), faults)) {
            file.takes.push_back({index, {entry.key, where_of(entry)}});
            const std::string what = map.name("takes") + "." + entry.key;
            if (std::optional<std::string> part = read_part(entry.value, what, cause.parts, faults)) {
                cause.takes.emplace(entry.key, std::move(*part));
            }
        }
    }
}

void read_causes(const Node& node, TableSet& set, SetFile& file, Diagnostics& faults) {
    std::vector<PlacedText> named_parts;
    for (const Entry& entry : entries_of(node, "causes", faults)) {
        if (!check_key(entry, "causes", faults)) {
            continue;
        }
        StrictMap map(entry.value, "causes." + entry.key, faults);
        Cause cause;
        cause.id = entry.key;
        cause.where = where_of(entry);
        cause.title = map.required_text("title").value_or(entry.key);
        cause.icd10cm = map.optional_text("icd10cm").value_or("");
        cause.note = map.optional_text("note").value_or("");
        read_composite(map, map.optional("parts"), cause, set.causes.size(), file, named_parts, faults);
        map.finish();
        set.causes.push_back(std::move(cause));
    }
    std::vector<std::string> single;
    for (const Cause& cause : set.causes) {
        if (cause.parts.empty()) {
            single.push_back(cause.id);
        }
    }
    for (const PlacedText& part : named_parts) {
        const Cause* cause = set.find_cause(part.text);
        if (cause == nullptr) {
            faults.add(part.where, Code::unknown_cause,
                       fmt::format("part {} is no cause of this set", part.text),
                       name_hint(part.text, single));
        } else if (!cause->parts.empty()) {
            faults.add(part.where, Code::bad_composite,
                       fmt::format("part {} is itself a composite", part.text), "name its parts instead");
        }
    }
    if (single.size() < 2) {
        faults.add(node.where(), Code::too_few_causes,
                   "a set needs at least two causes that are not composites");
    }
    file.causes_read = !single.empty();
}

void read_features(const Node& node, TableSet& set, Diagnostics& faults) {
    for (const Entry& entry : entries_of(node, "features", faults)) {
        if (!check_key(entry, "features", faults)) {
            continue;
        }
        if (describe_quantity(entry.key)) {
            faults.add(where_of(entry), Code::duplicate_finding,
                       fmt::format("feature {} has the name of a measured quantity", entry.key),
                       "choose another name");
            continue;
        }
        StrictMap map(entry.value, "features." + entry.key, faults);
        Feature feature;
        feature.id = entry.key;
        feature.title = map.required_text("title").value_or(entry.key);
        if (const Node* levels = map.required("levels")) {
            feature.levels = read_levels(*levels, map.name("levels"), faults);
        }
        map.finish();
        set.features.push_back(std::move(feature));
    }
}

/// The findings of a group or list of alternatives: existing, at least two, each in one list only.
std::vector<std::string> read_members(StrictMap& map, const std::vector<std::string>& finding_ids, Code code,
                                      std::map<std::string, std::string>& taken, const std::string& name,
                                      Diagnostics& faults) {
    std::vector<std::string> members;
    const Node* node = map.required("findings");
    if (node == nullptr) {
        return members;
    }
    const std::size_t before = faults.size();
    for (PlacedText& member : read_identifiers(*node, map.name("findings"), faults)) {
        if (!contains(finding_ids, member.text)) {
            faults.add(member.where, Code::unknown_finding,
                       fmt::format("{}: {} is no finding of this set", map.name("findings"), member.text),
                       name_hint(member.text, finding_ids));
            continue;
        }
        const auto [where, is_new] = taken.emplace(member.text, name);
        if (!is_new) {
            faults.add(
                member.where, code,
                fmt::format("{}: {} is already in \"{}\"", map.name("findings"), member.text, where->second),
                "a finding may stand in one such list only");
            continue;
        }
        members.push_back(std::move(member.text));
    }
    if (members.size() < 2 && faults.size() == before) {
        faults.add(node->where(), code, fmt::format("{} needs at least two findings", map.name("findings")));
    }
    return members;
}

void read_groups(const Node& node, const std::vector<std::string>& finding_ids, TableSet& set,
                 Diagnostics& faults) {
    std::map<std::string, std::string> taken;
    for (const Node& item : items_of(node, "groups", faults)) {
        StrictMap map(item, fmt::format("groups[{}]", set.groups.size() + 1), faults);
        Group group;
        group.name = map.required_text("name").value_or("");
        group.findings = read_members(map, finding_ids, Code::bad_group, taken, group.name, faults);
        group.rho = map.required_number("rho", 0.0, 1.0).value_or(0.0);
        if (map.usable()) {
            group.grounds =
                document::read_grounds(map, set.sources, true, faults).value_or(document::Grounds{});
        }
        group.why = map.optional_text("why").value_or("");
        map.finish();
        set.groups.push_back(std::move(group));
    }
}

void read_one_of(const Node& node, const std::vector<std::string>& finding_ids, TableSet& set,
                 Diagnostics& faults) {
    std::map<std::string, std::string> taken;
    for (const Node& item : items_of(node, "one_of", faults)) {
        StrictMap map(item, fmt::format("one_of[{}]", set.one_of.size() + 1), faults);
        OneOf one_of;
        one_of.name = map.required_text("name").value_or("");
        one_of.findings = read_members(map, finding_ids, Code::bad_one_of, taken, one_of.name, faults);
        one_of.why = map.optional_text("why").value_or("");
        map.finish();
        set.one_of.push_back(std::move(one_of));
    }
}

void check_features_against_tables(const SetFile& file, const TableSet& set, Diagnostics& faults) {
    const Node* features = file.root->find("features");
    if (features == nullptr) {
        return;
    }
    for (const Entry& entry : features->entries) {
        const EvidenceTable* table = set.find_table(entry.key);
        const bool in_joint =
            std::any_of(set.tables.begin(), set.tables.end(),
                        [&](const EvidenceTable& other) { return contains(other.joint_of, entry.key); });
        if (table != nullptr || in_joint) {
            faults.add(where_of(entry), Code::duplicate_finding,
                       fmt::format("feature {} has an evidence table of its own", entry.key),
                       "list here only the features that no table reads");
        }
    }
}

}  // namespace

SetFile begin_set_file(const Node& root, TableSet& set, Diagnostics& faults) {
    SetFile file;
    file.root = &root;
    file.map = std::make_unique<StrictMap>(root, "", faults);
    StrictMap& map = *file.map;
    if (!map.usable() || !map.require_format("steelyard.table-set/1")) {
        file.map.reset();
        return file;
    }
    set.title = map.required_text("title").value_or("");
    set.caution = map.optional_text("caution").value_or("");
    set.sources = document::read_sources(map, faults);
    if (const Node* causes = map.required("causes")) {
        read_causes(*causes, set, file, faults);
    }
    if (const Node* findings = map.required("findings")) {
        const std::size_t before = faults.size();
        for (PlacedText& finding : read_identifiers(*findings, "findings", faults)) {
            const bool repeated =
                std::any_of(file.findings.begin(), file.findings.end(),
                            [&](const PlacedText& other) { return other.text == finding.text; });
            if (repeated) {
                faults.add(finding.where, Code::duplicate_finding,
                           fmt::format("findings lists {} twice", finding.text));
            } else {
                file.findings.push_back(std::move(finding));
            }
        }
        if (file.findings.empty() && faults.size() == before) {
            faults.add(findings->where(), Code::empty_value, "findings is empty");
        }
        file.findings_read = !file.findings.empty();
    }
    if (const Node* features = map.optional("features")) {
        read_features(*features, set, faults);
    }
    return file;
}

void finish_set_file(SetFile& file, const std::vector<std::string>& finding_ids, TableSet& set,
                     Diagnostics& faults) {
    if (!file.map) {
        return;
    }
    StrictMap& map = *file.map;
    for (const SetFile::Takes& takes : file.takes) {
        if (!contains(finding_ids, takes.finding.text)) {
            faults.add(takes.finding.where, Code::unknown_finding,
                       fmt::format("causes.{}.takes: {} is no finding of this set",
                                   set.causes[takes.cause].id, takes.finding.text),
                       name_hint(takes.finding.text, finding_ids));
        }
    }
    check_features_against_tables(file, set, faults);
    if (const Node* groups = map.optional("groups")) {
        read_groups(*groups, finding_ids, set, faults);
    }
    if (const Node* one_of = map.optional("one_of")) {
        read_one_of(*one_of, finding_ids, set, faults);
    }
    if (const Node* gate = map.required("gate")) {
        read_gate(*gate, set, faults);
    }
    if (const Node* urgent = map.optional("urgent")) {
        read_urgent(*urgent, set, faults);
    }
    if (const Node* variation = map.optional("variation")) {
        read_variation(*variation, set, faults);
    }
    check_sources_used(*file.root, set.sources, faults);
    map.finish();
}

}  // namespace steelyard::likelihoods::detail
