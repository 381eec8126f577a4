// SPDX-License-Identifier: Apache-2.0
#pragma once
// Reads one evidence table in two steps: its head (what it is about, its bands), and, when the causes and
// features of the whole set are known, its conditions and rows.

#include <memory>
#include <string>
#include <vector>

#include "nodes.hpp"
#include "quantity_text.hpp"
#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods::detail {

/// A table between the two steps. Holds on to the document, which must outlive it.
struct TableFile {
    const document::Node* root = nullptr;
    std::unique_ptr<document::StrictMap> map;
    EvidenceTable table;
    document::SourcePosition finding_at;
    std::string file_stem;                  ///< name of the file without folder and ending
    bool kind_known = false;                ///< quantity, feature or joint: not so when the name is a slip
    bool bands_known = false;               ///< rows can be checked against the bands
    std::optional<QuantityRange> quantity;  ///< of a quantity table
    double unit_factor = 1.0;               ///< from the unit as written to the canonical unit
    std::string unit_as_written;            ///< set when it differs from the canonical unit
};

/// First step: format, finding, title, unit, bands, burden, caution, least, sources.
/// The result has no map when the file is no evidence table at all.
TableFile begin_table_file(const document::Node& root, const std::string& file_stem,
                           document::Diagnostics& faults);

/// The bands part of the first step, by kind of finding.
void read_bands(TableFile& file, document::Diagnostics& faults);

/// What the second step needs to know of the whole set.
struct SetNames {
    std::vector<std::string> single_causes;  ///< not composites, in the order of the set; empty when unknown
    std::vector<std::string> composites;
    std::vector<std::string> cause_titles;  ///< of single_causes
    FeatureVocabulary vocabulary;
    bool features_known = false;  ///< set.yaml was read, so a feature not in `vocabulary` is a slip
};

/// Second step: usable_when, study_mix, rows (compiled).
void finish_table_file(TableFile& file, const SetNames& names, document::Diagnostics& faults);

/// The part of the second step that reads `usable_when`.
std::vector<Condition> read_conditions(const document::Node& node, const SetNames& names,
                                       const document::Sources& sources, document::Diagnostics& faults);

/// The part of the second step that reads `rows` and `study_mix`.
void read_rows(TableFile& file, const document::Node* rows, const document::Node* study_mix,
               const SetNames& names, document::Diagnostics& faults);

}  // namespace steelyard::likelihoods::detail
