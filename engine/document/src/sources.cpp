// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/sources.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>

namespace steelyard::document {

namespace {
constexpr std::array<std::string_view, 6> basis_names{"study",    "review",   "guideline",
                                                      "practice", "elicited", "memory"};

/// Keys of sources are free names such as `larkmoor-2026`: letters, digits, `-`, `_` and `.`.
bool is_source_key(std::string_view text) noexcept {
    const auto is_letter_or_digit = [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9');
    };
    return !text.empty() && is_letter_or_digit(text.front()) &&
           std::all_of(text.begin(), text.end(),
                       [&](char c) { return is_letter_or_digit(c) || c == '-' || c == '_' || c == '.'; });
}

std::optional<Source> read_source(const Entry& entry, const std::string& what, const std::string& file,
                                  Diagnostics& faults) {
    Source source;
    source.key = entry.key;
    source.where = {file, entry.line, entry.column};
    if (!is_source_key(entry.key)) {
        faults.add(source.where, Code::bad_identifier,
                   fmt::format("\"{}\" cannot be the key of a source", entry.key),
                   "use letters, digits, `-`, `_` and `.`, beginning with a letter or digit");
        return std::nullopt;
    }
    if (entry.value.kind != Kind::mapping) {
        std::optional<std::string> cite = read_text_value(entry.value, what, faults);
        if (!cite) {
            return std::nullopt;
        }
        source.cite = std::move(*cite);
        return source;
    }
    StrictMap map(entry.value, what, faults);
    source.cite = map.required_text("cite").value_or(std::string());
    source.doi = map.optional_text("doi").value_or(std::string());
    source.seen = map.optional_text("seen").value_or(std::string());
    map.finish();
    return source;
}

std::optional<Basis> read_basis(StrictMap& map, bool practice_allowed, Diagnostics& faults) {
    const Node* node = map.required("basis");
    if (node == nullptr) {
        return std::nullopt;
    }
    const std::string what = map.name("basis");
    const std::optional<std::string> word = read_text_value(*node, what, faults);
    if (!word) {
        return std::nullopt;
    }
    const auto* const found = std::find(basis_names.begin(), basis_names.end(), *word);
    const auto basis = static_cast<Basis>(found - basis_names.begin());
    if (found != basis_names.end() && (practice_allowed || basis != Basis::practice)) {
        return basis;
    }
    std::vector<std::string> allowed;
    for (const std::string_view name : basis_names) {
        if (practice_allowed || name != "practice") {
            allowed.emplace_back(name);
        }
    }
    const std::string close = nearest(*word, allowed);
    faults.add(node->where(), Code::bad_basis,
               fmt::format("{} is \"{}\", but must be one of {}", what, *word,
                           fmt::join(allowed.begin(), allowed.end(), ", ")),
               close.empty() ? std::string() : fmt::format("did you mean {}?", close));
    return std::nullopt;
}

/// The keys of `source`, one or a list, each with its place.
std::vector<const Node*> source_nodes(StrictMap& map, bool required, Diagnostics& faults) {
    std::vector<const Node*> nodes;
    const Node* node = required ? map.required("source") : map.optional("source");
    if (node == nullptr) {
        return nodes;
    }
    if (node->kind != Kind::sequence) {
        nodes.push_back(node);
        return nodes;
    }
    if (node->items.empty()) {
        faults.add(node->where(), Code::empty_value, fmt::format("{} is an empty list", map.name("source")));
    }
    for (const Node& item : node->items) {
        nodes.push_back(&item);
    }
    return nodes;
}
}  // namespace

std::string_view to_string(Basis basis) noexcept {
    return basis_names[static_cast<std::size_t>(basis)];
}

bool is_judged(Basis basis) noexcept {
    return basis == Basis::elicited || basis == Basis::memory;
}

const Source* find_source(const Sources& sources, std::string_view key) noexcept {
    const auto found = std::find_if(sources.begin(), sources.end(),
                                    [key](const Source& source) { return source.key == key; });
    return found == sources.end() ? nullptr : &*found;
}

Sources read_sources(StrictMap& map, Diagnostics& faults) {
    Sources sources;
    const Node* node = map.optional("sources");
    if (node == nullptr) {
        return sources;
    }
    const std::string what = map.name("sources");
    if (node->kind != Kind::mapping) {
        faults.add(node->where(), Code::wrong_type,
                   fmt::format("{} must be a mapping of keys to sources", what),
                   "write `key: text of the source`, one on each line");
        return sources;
    }
    for (const Entry& entry : node->entries) {
        if (auto source =
                read_source(entry, fmt::format("{}.{}", what, entry.key), node->where().file, faults)) {
            sources.push_back(std::move(*source));
        }
    }
    return sources;
}

std::optional<Grounds> read_grounds(StrictMap& map, const Sources& sources, bool practice_allowed,
                                    Diagnostics& faults) {
    if (!map.usable()) {
        return std::nullopt;
    }
    const std::optional<Basis> basis = read_basis(map, practice_allowed, faults);
    const std::string what = map.name("source");
    const bool needs_source =
        basis && (*basis == Basis::study || *basis == Basis::review || *basis == Basis::guideline);
    Grounds grounds;
    std::vector<std::string> known;
    for (const Source& source : sources) {
        known.push_back(source.key);
    }
    for (const Node* node : source_nodes(map, needs_source, faults)) {
        std::optional<std::string> key = read_text_value(*node, what, faults);
        if (!key) {
            continue;
        }
        if (find_source(sources, *key) == nullptr) {
            const std::string close = nearest(*key, known);
            faults.add(node->where(), Code::unknown_source,
                       fmt::format("{} is \"{}\", which is not among the file's sources", what, *key),
                       close.empty() ? "add it under sources" : fmt::format("did you mean {}?", close));
            continue;
        }
        grounds.sources.push_back(std::move(*key));
    }
    if (!basis) {
        return std::nullopt;
    }
    grounds.basis = *basis;
    return grounds;
}

}  // namespace steelyard::document
