// SPDX-License-Identifier: Apache-2.0
// The bands of an evidence table: edges of a quantity, levels of a feature, or the crossed bands of two
// findings.
#include <fmt/format.h>

#include "read_table_file.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Node;
using document::StrictMap;

namespace {

struct Edges {
    std::vector<double> canonical;
    std::vector<std::string> names;  ///< of the bands
};

/// Increasing edges inside the plausible range, with the names of the bands they make: the edges as written.
std::optional<Edges> read_edges(const Node& node, const std::string& what, const QuantityRange& quantity,
                                double factor, const std::string& unit_in_names, Diagnostics& faults) {
    const std::size_t before = faults.size();
    const std::optional<std::vector<double>> written = document::read_numbers(node, what, faults);
    if (!written || faults.size() != before) {
        return std::nullopt;
    }
    if (written->empty()) {
        faults.add(node.where(), Code::bad_edges,
                   fmt::format("{} is empty, but two bands need one edge", what));
        return std::nullopt;
    }
    Edges edges;
    std::vector<std::string> texts;
    for (std::size_t i = 0; i < written->size(); ++i) {
        const double edge = (*written)[i] * factor;
        const Node& item = node.items[i];
        if (!(quantity.low < edge && edge < quantity.high)) {
            faults.add(item.where(), Code::bad_edges,
                       fmt::format("{}: {} is outside the plausible range of {}, {:.6g} to {:.6g} {}", what,
                                   item.text, quantity.title, quantity.low, quantity.high, quantity.unit));
        } else if (!edges.canonical.empty() && !(edge > edges.canonical.back())) {
            faults.add(item.where(), Code::bad_edges,
                       fmt::format("{}: {} is not above the edge before it", what, item.text),
                       "edges must increase");
        }
        edges.canonical.push_back(edge);
        texts.push_back(item.text.starts_with('+') ? item.text.substr(1) : item.text);
    }
    if (faults.size() != before) {
        return std::nullopt;
    }
    edges.names.push_back(fmt::format("below {}{}", texts.front(), unit_in_names));
    for (std::size_t i = 1; i < texts.size(); ++i) {
        edges.names.push_back(fmt::format("{} to {}{}", texts[i - 1], texts[i], unit_in_names));
    }
    edges.names.push_back(fmt::format("{}{} or more", texts.back(), unit_in_names));
    return edges;
}

/// `names`: one for each band, all different.
void read_names(TableFile& file, const Node& node, Diagnostics& faults) {
    const std::optional<std::vector<std::string>> names = document::read_texts(node, "names", faults);
    if (!names || !file.bands_known) {
        return;
    }
    if (names->size() != file.table.band_names.size()) {
        faults.add(node.where(), Code::band_count,
                   fmt::format("names has {} entries, but there are {} bands", names->size(),
                               file.table.band_names.size()),
                   "one name for each band, from the lowest");
        return;
    }
    for (std::size_t i = 0; i < names->size(); ++i) {
        for (std::size_t j = 0; j < i; ++j) {
            if ((*names)[i] == (*names)[j]) {
                faults.add(node.items[i].where(), Code::conflicting_values,
                           fmt::format("names: two bands are called \"{}\"", (*names)[i]));
                return;
            }
        }
    }
    file.table.band_names = *names;
}

void refuse(const Node* node, std::string_view key, std::string_view why, Diagnostics& faults) {
    if (node != nullptr) {
        faults.add(node->where(), Code::conflicting_keys, fmt::format("{}: {}", key, why));
    }
}

void read_quantity_bands(TableFile& file, const Node* unit, const Node* edges, Diagnostics& faults) {
    EvidenceTable& table = file.table;
    const QuantityRange& quantity = *file.quantity;
    table.kind = FindingKind::quantity;
    table.unit = quantity.unit;
    bool unit_known = false;
    if (unit != nullptr) {
        if (const std::optional<std::string> text = document::read_text_value(*unit, "unit", faults)) {
            const std::optional<double> factor = read_unit_factor(*unit, "unit", *text, quantity, faults);
            unit_known = factor.has_value();
            file.unit_factor = factor.value_or(1.0);
            // A factor of 1 means the same numbers (mEq/L of sodium), and the reader sees the canonical unit.
            file.unit_as_written = file.unit_factor == 1.0 ? "" : *text;
        }
    } else if (unit_may_be_omitted(quantity.unit)) {
        unit_known = true;
    } else {
        faults.add(file.root->where(), Code::missing_key, "unit is missing",
                   fmt::format("write unit: {}, or a unit that converts to it", quantity.unit));
    }
    if (edges == nullptr) {
        faults.add(file.root->where(), Code::missing_key, "edges is missing",
                   fmt::format("{} is a quantity: give the edges of its bands", table.finding));
        return;
    }
    if (!unit_known) {
        return;
    }
    const std::string in_names = file.unit_as_written.empty() ? "" : " " + file.unit_as_written;
    if (std::optional<Edges> read =
            read_edges(*edges, "edges", quantity, file.unit_factor, in_names, faults)) {
        table.edges = std::move(read->canonical);
        table.band_names = std::move(read->names);
        file.bands_known = true;
    }
    if (table.title.empty()) {
        table.title = quantity.title;
    }
}

void read_joint_bands(TableFile& file, const Node& joint_of, const Node* edges, Diagnostics& faults) {
    EvidenceTable& table = file.table;
    table.kind = FindingKind::joint;
    const std::vector<PlacedText> members = read_identifiers(joint_of, "joint_of", faults);
    if (members.size() != 2 || members[0].text == members[1].text) {
        faults.add(joint_of.where(), Code::bad_joint, "joint_of must name two different findings");
        return;
    }
    if (edges == nullptr) {
        faults.add(file.root->where(), Code::missing_key, "edges is missing",
                   "give one list for each of the two findings");
        return;
    }
    const std::span<const Node> lists = items_of(*edges, "edges", faults);
    if (lists.size() != 2) {
        faults.add(edges->where(), Code::bad_joint,
                   "edges must be two lists, one for each finding of joint_of");
        return;
    }
    const std::size_t before = faults.size();
    std::vector<std::string> titles;
    for (std::size_t i = 0; i < 2; ++i) {
        table.joint_of.push_back(members[i].text);
        const std::string what = fmt::format("edges[{}]", i + 1);
        if (const std::optional<QuantityRange> quantity = describe_quantity(members[i].text)) {
            // The edges of a joint table are in the canonical unit of each finding.
            std::optional<Edges> read = read_edges(lists[i], what, *quantity, 1.0, "", faults);
            table.joint_edges.push_back(read ? std::move(read->canonical) : std::vector<double>{});
            table.joint_names.push_back(read ? std::move(read->names) : std::vector<std::string>{});
        } else {
            table.joint_edges.emplace_back();
            table.joint_names.push_back(read_levels(lists[i], what, faults));
        }
    }
    if (faults.size() != before) {
        return;
    }
    for (const std::string& first : table.joint_names[0]) {
        for (const std::string& second : table.joint_names[1]) {
            table.band_names.push_back(fmt::format("{}; {}", first, second));
        }
    }
    file.bands_known = true;
}

}  // namespace

void read_bands(TableFile& file, Diagnostics& faults) {
    StrictMap& map = *file.map;
    EvidenceTable& table = file.table;
    const std::optional<std::string> title = map.optional_text("title");
    const Node* unit = map.optional("unit");
    const Node* edges = map.optional("edges");
    const Node* levels = map.optional("levels");
    const Node* joint_of = map.optional("joint_of");
    const Node* names = map.optional("names");
    table.title = title.value_or("");
    file.quantity = describe_quantity(table.finding);
    file.kind_known = joint_of != nullptr || levels != nullptr || file.quantity;
    if (joint_of != nullptr) {
        file.quantity.reset();
        refuse(levels, "levels", "a joint table gives the levels of a feature in `edges`", faults);
        refuse(unit, "unit", "the edges of a joint table are in each finding's canonical unit", faults);
        refuse(names, "names", "the cells of a joint table are named by the bands of its findings", faults);
        if (describe_quantity(table.finding)) {
            faults.add(file.finding_at, Code::bad_joint,
                       fmt::format("finding: a joint table needs a name of its own, but {} is a quantity",
                                   table.finding));
        }
        read_joint_bands(file, *joint_of, edges, faults);
    } else if (file.quantity) {
        refuse(levels, "levels", fmt::format("{} is a quantity and has `edges`", table.finding), faults);
        read_quantity_bands(file, unit, edges, faults);
    } else if (levels != nullptr) {
        table.kind = FindingKind::feature;
        refuse(unit, "unit", "a feature has levels and no unit", faults);
        refuse(edges, "edges", "a feature has `levels`", faults);
        table.levels = read_levels(*levels, "levels", faults);
        table.band_names = table.levels;
        file.bands_known = table.levels.size() >= 2;
    } else {
        const std::vector<std::string> known = quantity_ids();
        std::string hint = name_hint(table.finding, known);
        faults.add(file.finding_at, Code::unknown_quantity,
                   fmt::format("finding: {} is no quantity this program knows", table.finding),
                   hint.empty() ? "a feature that is seen or asked for needs `levels`" : hint);
    }
    if (file.kind_known && table.kind != FindingKind::quantity && !title) {
        faults.add(
            file.root->where(), Code::missing_key, "title is missing",
            fmt::format("{} is no laboratory quantity, so the program has no title for it", table.finding));
    }
    if (names != nullptr && joint_of == nullptr) {
        read_names(file, *names, faults);
    }
}

}  // namespace steelyard::likelihoods::detail
