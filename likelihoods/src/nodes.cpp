// SPDX-License-Identifier: Apache-2.0
#include "nodes.hpp"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Entry;
using document::Kind;
using document::Node;

document::SourcePosition where_of(const Entry& entry) {
    document::SourcePosition where = entry.value.where();
    where.line = entry.line;
    where.column = entry.column;
    return where;
}

std::span<const Entry> entries_of(const Node& node, std::string_view what, Diagnostics& faults) {
    if (node.kind != Kind::mapping) {
        faults.add(node.where(), Code::wrong_type, fmt::format("{} must be a mapping", what));
        return {};
    }
    return node.entries;
}

std::span<const Node> items_of(const Node& node, std::string_view what, Diagnostics& faults) {
    if (node.kind != Kind::sequence) {
        faults.add(node.where(), Code::wrong_type, fmt::format("{} must be a list", what), "write it in [ ]");
        return {};
    }
    return node.items;
}

std::vector<PlacedText> read_identifiers(const Node& node, std::string_view what, Diagnostics& faults) {
    std::vector<PlacedText> texts;
    for (const Node& item : items_of(node, what, faults)) {
        if (std::optional<std::string> text = document::read_identifier(item, what, faults)) {
            texts.push_back({std::move(*text), item.where()});
        }
    }
    return texts;
}

bool check_key(const Entry& entry, std::string_view what, Diagnostics& faults) {
    if (document::is_identifier(entry.key)) {
        return true;
    }
    faults.add(where_of(entry), Code::bad_identifier,
               fmt::format("{}: \"{}\" is not a name", what, entry.key),
               "use lower-case letters, digits and underscores, beginning with a letter");
    return false;
}

std::string name_hint(std::string_view word, std::span<const std::string> known) {
    if (std::string near = document::nearest(word, known); !near.empty()) {
        return fmt::format("did you mean {}?", near);
    }
    constexpr std::size_t short_list = 12;
    if (!known.empty() && known.size() <= short_list) {
        return fmt::format("known: {}", fmt::join(known, ", "));
    }
    return {};
}

bool contains(std::span<const std::string> list, std::string_view word) {
    return std::find(list.begin(), list.end(), word) != list.end();
}

std::vector<std::string> read_levels(const Node& node, std::string_view what, Diagnostics& faults) {
    std::vector<std::string> levels;
    const std::size_t before = faults.size();
    for (PlacedText& level : read_identifiers(node, what, faults)) {
        if (contains(levels, level.text)) {
            faults.add(level.where, Code::bad_level, fmt::format("{} names {} twice", what, level.text));
        } else {
            levels.push_back(std::move(level.text));
        }
    }
    if (levels.size() < 2 && faults.size() == before) {
        faults.add(node.where(), Code::band_count, fmt::format("{} needs at least two levels", what),
                   "for a yes-or-no feature write [present, absent]");
    }
    return levels;
}

namespace {

void collect_cited(const Node& node, std::set<std::string, std::less<>>& cited) {
    for (const Node& item : node.items) {
        collect_cited(item, cited);
    }
    for (const Entry& entry : node.entries) {
        if (entry.key == "source") {
            if (entry.value.kind == Kind::scalar) {
                cited.insert(entry.value.text);
            }
            for (const Node& item : entry.value.items) {
                cited.insert(item.text);
            }
        }
        collect_cited(entry.value, cited);
    }
}

}  // namespace

void check_sources_used(const Node& root, const document::Sources& sources, Diagnostics& faults) {
    // Taken from the text rather than from what was read, so that a faulty row does not also leave its source
    // unused.
    std::set<std::string, std::less<>> cited;
    collect_cited(root, cited);
    for (const document::Source& source : sources) {
        if (!cited.contains(source.key)) {
            faults.add(source.where, Code::unused_source,
                       fmt::format("source {} is cited by nothing here", source.key),
                       "cite it with `source`, or take it out");
        }
    }
}

}  // namespace steelyard::likelihoods::detail
