// SPDX-License-Identifier: Apache-2.0
// `rows` and `study_mix`: one row for each cause that is not a composite, no others.
#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "given_row.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Entry;
using document::Node;

namespace {

/// Whether a key names a cause that has rows; unknown_cause at the key otherwise.
bool check_cause(const Entry& entry, std::string_view what, const SetNames& names, Diagnostics& faults) {
    if (contains(names.composites, entry.key)) {
        faults.add(where_of(entry), Code::unknown_cause,
                   fmt::format("{}: {} is a composite and takes its rows from its parts", what, entry.key));
        return false;
    }
    if (!names.single_causes.empty() && !contains(names.single_causes, entry.key)) {
        faults.add(where_of(entry), Code::unknown_cause,
                   fmt::format("{}: {} is no cause of this set", what, entry.key),
                   name_hint(entry.key, names.single_causes));
        return false;
    }
    return true;
}

/// Shares of the rows' causes in the study that measured the ratios, in the order of the set.
std::optional<std::vector<double>> read_study_mix(const Node& node, const SetNames& names,
                                                  Diagnostics& faults) {
    constexpr double tolerance = 0.005;  // as for shares: published percentages are rounded
    const std::size_t before = faults.size();
    std::vector<double> mix(names.single_causes.size(), 0.0);
    for (const Entry& entry : entries_of(node, "study_mix", faults)) {
        if (!check_cause(entry, "study_mix", names, faults)) {
            continue;
        }
        const std::string what = "study_mix." + entry.key;
        const std::optional<double> share = document::read_number(entry.value, what, faults, 0.0, 1.0);
        if (share && (*share == 0.0 || *share == 1.0)) {
            faults.add(entry.value.where(), Code::study_mix,
                       fmt::format("{} is {}, but a ratio against the rest needs both the cause and a rest",
                                   what, *share));
        }
        const auto at = std::find(names.single_causes.begin(), names.single_causes.end(), entry.key);
        if (share && at != names.single_causes.end()) {
            mix[static_cast<std::size_t>(at - names.single_causes.begin())] = *share;
        }
    }
    if (faults.size() != before || mix.empty()) {
        return std::nullopt;
    }
    for (std::size_t i = 0; i < mix.size(); ++i) {
        if (mix[i] == 0.0) {
            faults.add(node.where(), Code::study_mix,
                       fmt::format("study_mix has no share of {}", names.single_causes[i]));
        }
    }
    const double total = std::accumulate(mix.begin(), mix.end(), 0.0);
    if (faults.size() == before && !(std::abs(total - 1.0) <= tolerance + 1e-12)) {
        faults.add(node.where(), Code::study_mix,
                   fmt::format("study_mix sums to {:.6g}, but must be 1 within {}", total, tolerance));
    }
    if (faults.size() != before) {
        return std::nullopt;
    }
    for (double& share : mix) {
        share /= total;
    }
    return mix;
}

/// One-against-rest ratios are solved together: all rows of a table have that form, or none.
bool check_ratio_to_rest(const std::vector<GivenRow>& given, const Node& rows, const Node* study_mix,
                         Diagnostics& faults) {
    const auto is_rest = [](const GivenRow& row) { return row.row.form == RowForm::ratio_to_rest; };
    const auto of_that_form = static_cast<std::size_t>(std::count_if(given.begin(), given.end(), is_rest));
    if (of_that_form == 0) {
        if (study_mix != nullptr) {
            faults.add(study_mix->where(), Code::study_mix,
                       "study_mix goes with rows of the form ratio_to_rest, and there are none");
        }
        return true;
    }
    if (study_mix == nullptr) {
        faults.add(rows.where(), Code::study_mix,
                   "ratio_to_rest needs the study_mix of the study that measured the ratios",
                   "a ratio against the rest depends on what the rest was");
    }
    if (of_that_form != given.size()) {
        for (const GivenRow& row : given) {
            if (!is_rest(row)) {
                faults.add(
                    row.row.where, Code::row_form,
                    fmt::format("rows.{}: when one row is ratio_to_rest, all rows must be", row.row.cause));
            }
        }
        return false;
    }
    return study_mix != nullptr;
}

}  // namespace

void read_rows(TableFile& file, const Node* rows, const Node* study_mix, const SetNames& names,
               Diagnostics& faults) {
    std::optional<std::vector<double>> mix;
    if (study_mix != nullptr) {
        mix = read_study_mix(*study_mix, names, faults);
    }
    if (rows == nullptr) {
        return;
    }
    std::vector<GivenRow> given;
    for (const Entry& entry : entries_of(*rows, "rows", faults)) {
        if (!check_cause(entry, "rows", names, faults)) {
            continue;
        }
        given.push_back(read_row(entry.value, entry.key, file, names, faults));
        given.back().row.where = where_of(entry);
    }
    if (rows->kind != document::Kind::mapping) {
        return;
    }
    for (const std::string& cause : names.single_causes) {
        if (rows->find(cause) == nullptr) {
            faults.add(rows->where(), Code::missing_row, fmt::format("rows has no row for {}", cause),
                       "every cause that is not a composite needs one");
        }
    }
    const auto rank = [&](const GivenRow& row) {
        return std::find(names.single_causes.begin(), names.single_causes.end(), row.row.cause);
    };
    std::stable_sort(given.begin(), given.end(),
                     [&](const GivenRow& a, const GivenRow& b) { return rank(a) < rank(b); });
    if (!check_ratio_to_rest(given, *rows, study_mix, faults) || !file.bands_known ||
        names.single_causes.empty()) {
        return;
    }
    compile_rows(given, mix, file.table, faults);
}

}  // namespace steelyard::likelihoods::detail
