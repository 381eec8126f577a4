// SPDX-License-Identifier: Apache-2.0
#include "tables_views.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/likelihoods/cause_ratios.hpp"
#include "steelyard/likelihoods/words.hpp"

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;
using likelihoods::Cause;
using likelihoods::EvidenceRow;
using likelihoods::EvidenceTable;
using likelihoods::TableSet;

Json row_json(const EvidenceRow& row) {
    return {{"cause", row.cause},
            {"form", likelihoods::to_string(row.form)},
            {"as_given", row.as_given},
            {"worth", row.effective_patients},
            {"basis", document::to_string(row.grounds.basis)},
            {"source", row.grounds.sources},
            {"note", row.note},
            {"least_acted", row.least_acted},
            {"probability",
             std::vector<double>(row.compiled.probability.begin(), row.compiled.probability.end())}};
}

Json ratios_json(const TableSet& set, const EvidenceTable& table, const std::string& cause,
                 const std::string& against) {
    Json bands = Json::array();
    for (const BandRatio& ratio : band_ratios(set, table, cause, against)) {
        bands.push_back(
            {{"band", ratio.band}, {"ratio", ratio.value}, {"low", ratio.low}, {"high", ratio.high}});
    }
    return {{"cause", cause}, {"against", against}, {"bands", bands}};
}

Json sources_json(const document::Sources& sources) {
    Json list = Json::object();
    for (const document::Source& source : sources) {
        list[source.key] = {{"cite", source.cite}, {"doi", source.doi}, {"seen", source.seen}};
    }
    return list;
}

}  // namespace

std::vector<BandRatio> band_ratios(const TableSet& set, const EvidenceTable& table, const std::string& cause,
                                   const std::string& against) {
    const std::vector<engine::IntervalEstimate> estimates =
        likelihoods::cause_ratios(set, table, cause, against);
    std::vector<BandRatio> ratios;
    for (std::size_t band = 0; band < estimates.size(); ++band) {
        ratios.push_back(
            {table.band_names[band], estimates[band].value, estimates[band].low, estimates[band].high});
    }
    return ratios;
}

std::string takes_words(const TableSet& set, const Cause& composite) {
    std::string words;
    for (const auto& [finding, part] : composite.takes) {
        words += fmt::format("{} from {}; ", likelihoods::title_in_sentence(set.title_of(finding)),
                             likelihoods::title_in_sentence(set.title_of(part)));
    }
    return words + fmt::format("all others from {}",
                               likelihoods::title_in_sentence(set.title_of(composite.otherwise)));
}

Json tables_json(const TableSet& set, const std::vector<const EvidenceTable*>& tables,
                 const std::string& cause, const std::string& against) {
    Json result = {
        {"format", "steelyard.tables/1"}, {"title", set.title}, {"name", set.name}, {"digest", set.digest}};
    result["causes"] = Json::array();
    for (const Cause& entry : set.causes) {
        Json json = {{"id", entry.id}, {"title", entry.title}, {"icd10cm", entry.icd10cm}};
        if (!entry.parts.empty()) {
            json["parts"] = entry.parts;
            json["takes"] = entry.takes;
            json["otherwise"] = entry.otherwise;
        }
        result["causes"].push_back(std::move(json));
    }
    result["findings"] = Json::array();
    for (const EvidenceTable* table : tables) {
        Json json = {{"finding", table->finding},
                     {"title", table->title},
                     {"unit", table->unit},
                     {"burden", table->burden}};
        json["caution"] = table->caution;
        json["bands"] = table->band_names;
        json["edges"] = table->edges;
        json["usable_when"] = Json::array();
        for (const likelihoods::Condition& condition : table->usable_when) {
            json["usable_when"].push_back({{"condition", likelihoods::condition_in_words(set, condition)},
                                           {"otherwise", condition.otherwise}});
        }
        json["rows"] = Json::array();
        for (const EvidenceRow& row : table->rows) {
            json["rows"].push_back(row_json(row));
        }
        if (!cause.empty()) {
            json["ratios"] = ratios_json(set, *table, cause, against);
        }
        json["sources"] = sources_json(table->sources);
        result["findings"].push_back(std::move(json));
    }
    return result;
}

}  // namespace steelyard::cli
