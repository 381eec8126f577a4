// SPDX-License-Identifier: Apache-2.0
#pragma once
// What a figure rests on. Every number in a clinic's files carries a basis and, where there is one, a source.

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/strict_map.hpp"

namespace steelyard::document {

/// study: read in a primary report; review: read in a review, table or text; guideline: read in a guideline;
/// practice: common practice of the trade; elicited: judgement; memory: remembered, not read.
enum class Basis { study, review, guideline, practice, elicited, memory };

std::string_view to_string(Basis basis) noexcept;

/// One entry of a file's `sources`: either a plain text (`larkmoor-2026: "Agreed by ..."`) or `{cite, doi,
/// seen}`.
struct Source {
    std::string key;
    std::string cite;
    std::string doi;   ///< may be empty
    std::string seen;  ///< abstract, table, full text, ...; may be empty
    SourcePosition where;
};

/// The sources of a file by key, in order of the text.
using Sources = std::vector<Source>;

/// Reads the `sources` mapping of a file (absent is allowed and gives none).
Sources read_sources(StrictMap& map, Diagnostics& faults);

const Source* find_source(const Sources& sources, std::string_view key) noexcept;

/// A figure's basis and source as read from the keys `basis` and `source` of its mapping. study, review and
/// guideline need a source (missing_key); a source that is not listed is unknown_source; an unknown basis is
/// bad_basis.
struct Grounds {
    Basis basis = Basis::elicited;
    std::vector<std::string> sources;  ///< keys; `source` may be one key or a list of keys
};
/// @param practice_allowed  whether `practice` may be given (limits of a clinic) or not (evidence rows)
std::optional<Grounds> read_grounds(StrictMap& map, const Sources& sources, bool practice_allowed,
                                    Diagnostics& faults);

/// Whether it is judgement or memory rather than something read: such rows are kept off zero by the table's
/// `least`.
bool is_judged(Basis basis) noexcept;

}  // namespace steelyard::document
