// SPDX-License-Identifier: Apache-2.0
#pragma once
// Small steps of the table-set readers: walking mappings and lists, names with a nearest-name hint.

#include <functional>
#include <optional>
#include <set>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/sources.hpp"
#include "steelyard/document/strict_map.hpp"

namespace steelyard::likelihoods::detail {

/// A text of a list, with its place.
struct PlacedText {
    std::string text;
    document::SourcePosition where;
};

document::SourcePosition where_of(const document::Entry& entry);

/// The entries of a mapping; wrong_type and none when it is no mapping.
std::span<const document::Entry> entries_of(const document::Node& node, std::string_view what,
                                            document::Diagnostics& faults);

/// The items of a list; wrong_type and none when it is no list.
std::span<const document::Node> items_of(const document::Node& node, std::string_view what,
                                         document::Diagnostics& faults);

/// Identifiers of a list, each with its place.
std::vector<PlacedText> read_identifiers(const document::Node& node, std::string_view what,
                                         document::Diagnostics& faults);

/// Whether the key of an entry is an identifier; bad_identifier at the key otherwise.
bool check_key(const document::Entry& entry, std::string_view what, document::Diagnostics& faults);

/// `did you mean ...?`, or `known: ...` for a short list, or nothing.
std::string name_hint(std::string_view word, std::span<const std::string> known);

bool contains(std::span<const std::string> list, std::string_view word);

/// Levels of a feature: at least two, different, identifiers. @param what names the list in messages
std::vector<std::string> read_levels(const document::Node& node, std::string_view what,
                                     document::Diagnostics& faults);

/// Adds an unused_source fault for every source that no `source` key of the document names.
void check_sources_used(const document::Node& root, const document::Sources& sources,
                        document::Diagnostics& faults);

}  // namespace steelyard::likelihoods::detail
