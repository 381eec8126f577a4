// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/table_set.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <stdexcept>

namespace steelyard::likelihoods {

std::string_view to_string(RowForm form) noexcept {
    switch (form) {
        case RowForm::counts:
            return "counts";
        case RowForm::share:
            return "share";
        case RowForm::summary:
            return "mean";
        case RowForm::ratio:
            return "ratio";
        case RowForm::ratio_to_rest:
            return "ratio_to_rest";
        case RowForm::joint:
            return "joint";
    }
    return "";
}

const Cause* TableSet::find_cause(std::string_view id) const noexcept {
    const auto found =
        std::find_if(causes.begin(), causes.end(), [&](const Cause& cause) { return cause.id == id; });
    return found == causes.end() ? nullptr : &*found;
}

const EvidenceTable* TableSet::find_table(std::string_view finding) const noexcept {
    const auto found = std::find_if(tables.begin(), tables.end(),
                                    [&](const EvidenceTable& table) { return table.finding == finding; });
    return found == tables.end() ? nullptr : &*found;
}

FeatureVocabulary TableSet::vocabulary() const {
    FeatureVocabulary vocabulary;
    for (const EvidenceTable& table : tables) {
        if (table.kind == FindingKind::feature) {
            vocabulary.levels.emplace(table.finding, table.levels);
        }
        for (std::size_t i = 0; i < table.joint_of.size() && i < table.joint_names.size(); ++i) {
            if (table.joint_edges[i].empty()) {
                vocabulary.levels.emplace(table.joint_of[i], table.joint_names[i]);
            }
        }
    }
    for (const Feature& feature : features) {
        vocabulary.levels.emplace(feature.id, feature.levels);
    }
    return vocabulary;
}

std::string TableSet::title_of(std::string_view id) const {
    if (const Cause* cause = find_cause(id)) {
        return cause->title;
    }
    if (const EvidenceTable* table = find_table(id)) {
        return table->title;
    }
    if (const QuantityKind* quantity = find_quantity(id)) {
        return std::string(quantity->title);
    }
    for (const Feature& feature : features) {
        if (feature.id == id) {
            return feature.title;
        }
    }
    // A feature that only a joint table knows has no title of its own: its name in words.
    std::string words(id);
    std::replace(words.begin(), words.end(), '_', ' ');
    if (!words.empty() && words.front() >= 'a' && words.front() <= 'z') {
        words.front() = static_cast<char>(words.front() - 'a' + 'A');
    }
    return words;
}

const EvidenceRow& row_of(const TableSet& set, const EvidenceTable& table, std::string_view cause) {
    const Cause* wanted = set.find_cause(cause);
    if (wanted == nullptr) {
        throw std::out_of_range(fmt::format("row_of: {} is no cause of the set", cause));
    }
    std::string_view owner = wanted->id;
    if (!wanted->parts.empty()) {
        const auto taken = wanted->takes.find(table.finding);
        owner = taken != wanted->takes.end() ? taken->second : wanted->otherwise;
    }
    const auto row = std::find_if(table.rows.begin(), table.rows.end(),
                                  [&](const EvidenceRow& candidate) { return candidate.cause == owner; });
    if (row == table.rows.end()) {
        throw std::out_of_range(fmt::format("row_of: {} has no row for {}", table.finding, owner));
    }
    return *row;
}

Eigen::ArrayXXd band_probabilities(const TableSet& set, const EvidenceTable& table,
                                   const std::vector<std::string>& causes) {
    Eigen::ArrayXXd probabilities(table.bands(), static_cast<Eigen::Index>(causes.size()));
    Eigen::Index column = 0;
    for (const std::string& cause : causes) {
        probabilities.col(column++) = row_of(set, table, cause).compiled.probability;
    }
    return probabilities;
}

}  // namespace steelyard::likelihoods
