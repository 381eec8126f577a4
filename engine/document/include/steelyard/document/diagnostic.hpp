// SPDX-License-Identifier: Apache-2.0
#pragma once
// Faults found in a text: each with a place, a code that programs match, a sentence and a hint that people
// read. Readers collect faults to the end of all files and then throw one LoadError holding the list.

#include <cstddef>
#include <iosfwd>
#include <stdexcept>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/source_position.hpp"

namespace steelyard::document {

/// The closed list of fault codes; docs/formats.md explains each and a test keeps the two lists equal.
enum class Code {
    // the text itself
    unreadable_file,
    bad_encoding,
    syntax,
    empty_document,
    second_document,
    anchor,
    alias,
    tag,
    merge_key,
    too_large,
    too_deep,
    too_many_values,
    // its shape
    duplicate_key,
    unknown_key,
    missing_key,
    wrong_type,
    empty_value,
    not_a_number,
    not_finite,
    out_of_range,
    bad_choice,
    bad_identifier,
    bad_format,
    conflicting_keys,
    // cases
    unknown_analyte,
    unknown_feature,
    bad_level,
    bad_unit,
    implausible_value,
    bad_limit,
    conflicting_values,
    // prior sets
    bad_odds,
    incoherent_odds,
    bad_interval,
    too_few_causes,
    unknown_cause,
    composite_without_parts,
    // sources and basis
    bad_basis,
    unknown_source,
    unused_source,
    // evidence tables and table sets
    bad_edges,
    band_count,
    band_sum,
    band_zero,
    row_form,
    missing_row,
    ratio_sum,
    ratio_chain,
    study_mix,
    bad_joint,
    unknown_finding,
    duplicate_finding,
    unknown_quantity,
    bad_group,
    bad_one_of,
    bad_composite,
    bad_gate,
    bad_variation,
    missing_file,
    // tallies
    bad_tally,
    tally_mismatch
};

/// The code as written in messages and docs: `band-sum`.
std::string_view to_string(Code code) noexcept;

/// All codes in the order of the enum.
const std::vector<Code>& all_codes();

struct Diagnostic {
    SourcePosition where;
    Code code{};
    std::string message;      ///< what is wrong, in one sentence without a final stop
    std::string hint;         ///< what to do about it; may be empty
    std::string source_line;  ///< the line of text at `where`, for the caret; may be empty

    bool operator==(const Diagnostic&) const = default;
};

/// A list of faults, kept in the order file, line, column, then order of discovery.
class Diagnostics {
  public:
    void add(Diagnostic fault);
    void add(const SourcePosition& where, Code code, std::string message, std::string hint = {});
    bool empty() const noexcept { return faults_.empty(); }
    std::size_t size() const noexcept { return faults_.size(); }
    /// The faults sorted by file (order of first mention), line and column.
    std::vector<Diagnostic> sorted() const;

    /// Remembers the text of a file, so that faults added later by position can show their line. A second
    /// text of the same name replaces the first.
    void remember_text(const std::string& file, std::string_view text);

    /// The line of a remembered text at a position, without its line end; empty when there is none. The view
    /// lasts until the text is replaced.
    std::string_view remembered_line(const SourcePosition& where) const noexcept;

  private:
    struct Text {
        std::string file, text;
        std::vector<std::size_t> line_starts;
    };

    std::vector<Diagnostic> faults_;
    std::vector<Text> texts_;
};

/// Prints each fault as `file:line:column: error[code]: message`, the source line with a caret, and the hint.
/// Control characters of the input are shown as escapes, and over-long lines are cut around the caret.
void print(std::ostream& out, const Diagnostics& faults, bool colour = false);

/// Thrown once by a reader, with every fault of every file it was given.
class LoadError : public std::runtime_error {
  public:
    explicit LoadError(Diagnostics faults);
    const Diagnostics& faults() const noexcept { return faults_; }

  private:
    Diagnostics faults_;
};

}  // namespace steelyard::document
