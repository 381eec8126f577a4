// SPDX-License-Identifier: Apache-2.0
#include "read_table_file.hpp"

#include <fmt/format.h>

#include <array>

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Node;
using document::StrictMap;

namespace {

/// Raising must leave a judged row most of its own shape: all bands raised together may hold less than half
/// of it.
void check_least(const EvidenceTable& table, const document::SourcePosition& where, Diagnostics& faults) {
    constexpr double most_raised = 0.5;
    const auto bands = static_cast<double>(table.bands());
    if (table.least * bands >= most_raised) {
        faults.add(where, Code::out_of_range,
                   fmt::format("least {:.6g} times {} bands is {:.6g}, but must be below {:.6g}", table.least,
                               table.bands(), table.least * bands, most_raised),
                   fmt::format("a larger least would flatten judged rows; give one below {:.6g}",
                               most_raised / bands));
    }
}

}  // namespace

TableFile begin_table_file(const Node& root, const std::string& file_stem, Diagnostics& faults) {
    constexpr std::array<std::string_view, 3> burdens = {"bedside", "routine", "specialised"};
    constexpr double greatest_least = 0.2;
    TableFile file;
    file.root = &root;
    file.file_stem = file_stem;
    file.finding_at = root.where();
    file.map = std::make_unique<StrictMap>(root, "", faults);
    StrictMap& map = *file.map;
    if (!map.usable() || !map.require_format("steelyard.evidence-table/1")) {
        file.map.reset();
        return file;
    }
    EvidenceTable& table = file.table;
    if (const Node* finding = map.required("finding")) {
        file.finding_at = finding->where();
        table.finding = document::read_identifier(*finding, "finding", faults).value_or("");
    }
    table.where = file.finding_at;
    table.sources = document::read_sources(map, faults);
    table.burden = map.optional_choice("burden", burdens).value_or("routine");
    table.caution = map.optional_text("caution").value_or("");
    table.note = map.optional_text("note").value_or("");
    const Node* least = map.optional("least");
    if (least != nullptr) {
        const std::optional<double> value =
            document::read_number(*least, "least", faults, 0.0, greatest_least);
        if (value && *value == 0.0) {
            faults.add(least->where(), Code::out_of_range, "least must be above 0",
                       "nobody knows from judgement that a band cannot happen");
        }
        table.least = value.value_or(table.least);
    }
    if (!table.finding.empty()) {
        read_bands(file, faults);
    }
    if (file.bands_known) {
        check_least(table, least != nullptr ? least->where() : file.finding_at, faults);
    }
    return file;
}

void finish_table_file(TableFile& file, const SetNames& names, Diagnostics& faults) {
    StrictMap& map = *file.map;
    if (const Node* conditions = map.optional("usable_when")) {
        file.table.usable_when = read_conditions(*conditions, names, file.table.sources, faults);
    }
    const Node* study_mix = map.optional("study_mix");
    const Node* rows = map.required("rows");
    read_rows(file, rows, study_mix, names, faults);
    check_sources_used(*file.root, file.table.sources, faults);
    map.finish();
}

}  // namespace steelyard::likelihoods::detail
