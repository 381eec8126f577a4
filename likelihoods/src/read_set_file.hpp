// SPDX-License-Identifier: Apache-2.0
#pragma once
// Reads set.yaml in two steps: what the evidence tables need first (causes, findings, features), and after
// the tables what needs them (composites' rows, groups, alternatives, gate, urgent limits,
// variation).

#include <memory>
#include <string>
#include <vector>

#include "nodes.hpp"
#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods::detail {

/// set.yaml between the two steps. Holds on to the document, which must outlive it.
struct SetFile {
    const document::Node* root = nullptr;
    std::unique_ptr<document::StrictMap> map;
    std::vector<PlacedText> findings;  ///< as listed, without repetitions
    bool causes_read = false;          ///< rows can be checked against the causes
    bool findings_read = false;        ///< tables can be checked against the list
    struct Takes {
        std::size_t cause = 0;  ///< index into TableSet::causes
        PlacedText finding;
    };
    std::vector<Takes> takes;  ///< findings that composites name, still to be checked
};

/// First step. Fills title, caution, causes, features and sources of `set`.
SetFile begin_set_file(const document::Node& root, TableSet& set, document::Diagnostics& faults);

/// Second step, when `set.tables` holds every table that could be read. `finding_ids` are those that exist.
void finish_set_file(SetFile& file, const std::vector<std::string>& finding_ids, TableSet& set,
                     document::Diagnostics& faults);

/// The part of the second step that reads `gate`.
void read_gate(const document::Node& node, TableSet& set, document::Diagnostics& faults);

/// The part of the second step that reads `urgent`.
void read_urgent(const document::Node& node, TableSet& set, document::Diagnostics& faults);

/// The part of the second step that reads `variation`.
void read_variation(const document::Node& node, TableSet& set, document::Diagnostics& faults);

}  // namespace steelyard::likelihoods::detail
