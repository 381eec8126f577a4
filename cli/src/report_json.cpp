// SPDX-License-Identifier: Apache-2.0
#include "sensitivity_json.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/engine/log_weight.hpp"

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;
using likelihoods::Use;

Json urgent_json(const Weighing& weighing, const likelihoods::TableSet& tables) {
    Json list = Json::array();
    for (const likelihoods::UrgentValue& value : weighing.urgent) {
        list.push_back({{"quantity", value.quantity},
                        {"title", tables.title_of(value.quantity)},
                        {"value", value.value},
                        {"unit", value.unit},
                        {"limit", value.limit},
                        {"side", value.is_low ? "low" : "high"},
                        {"as_known", value.shown},
                        {"certain", value.certain},
                        {"basis", document::to_string(value.grounds.basis)},
                        {"source", value.grounds.sources}});
    }
    return list;
}

Json gate_json(const Weighing& weighing) {
    Json quantities = Json::object();
    for (const auto& [id, value] : weighing.gate.quantities) {
        quantities[id] = value;
    }
    return {{"status", likelihoods::to_string(weighing.gate.status)},
            {"reasons", weighing.gate.reasons},
            {"quantities", quantities}};
}

Json causes_json(const Weighing& weighing) {
    Json list = Json::array();
    for (const WeighedCause& cause : weighing.causes) {
        Json entry = {
            {"id", cause.id}, {"title", cause.title}, {"prior", cause.prior}, {"posterior", cause.posterior}};
        if (!cause.parts.empty()) {
            entry["parts"] = cause.parts;
        }
        list.push_back(std::move(entry));
    }
    return list;
}

/// The value as the case wrote it; null for a computed quantity.
Json as_read(const Weighing& weighing, const std::string& finding) {
    for (const auto* readings : {&weighing.panel.measured, &weighing.panel.given}) {
        const auto found = readings->find(finding);
        if (found != readings->end()) {
            const likelihoods::Reading& reading = found->second;
            return reading.unit_as_read.empty() ? reading.as_read
                                                : reading.as_read + " " + reading.unit_as_read;
        }
    }
    return nullptr;
}

Json ledger_entry_json(const Weighing& weighing, const likelihoods::TableSet& tables,
                       const LedgerEntry& entry) {
    const likelihoods::EvidenceTable& table = *entry.table;
    const likelihoods::FindingReading& reading = entry.reading;
    const bool used = reading.use == Use::read;
    Json json = {{"finding", table.finding}, {"title", table.title}};
    if (reading.value) {
        const bool point = reading.value->is_point();
        json["value"] = point ? Json(reading.value->low) : Json(nullptr);
        json["value_low"] = reading.value->low_is_floor ? Json(nullptr) : Json(reading.value->low);
        json["value_high"] = reading.value->high_is_ceiling ? Json(nullptr) : Json(reading.value->high);
    } else {
        json["value"] = reading.level.empty() ? Json(nullptr) : Json(reading.level);
        json["value_low"] = nullptr;
        json["value_high"] = nullptr;
    }
    json["value_as_read"] = as_read(weighing, table.finding);
    json["unit"] = table.unit.empty() ? Json(nullptr) : Json(table.unit);
    json["band"] = reading.band.empty() ? Json(nullptr) : Json(reading.band);
    json["band_index"] = used && reading.cells.size() == 1 ? Json(reading.cells.front()) : Json(nullptr);
    json["used"] = used;
    json["why_not"] = used ? Json(nullptr) : Json(reading.why_not);
    json["remarks"] = reading.remarks;
    json["unchecked"] = reading.unchecked;
    json["group"] = reading.group.empty() ? Json(nullptr) : Json(reading.group);
    json["weight"] = used ? Json(reading.weight) : Json(nullptr);
    json["log_likelihood"] = used ? Json::object() : Json(nullptr);
    json["decibans"] = used ? Json(decibans(entry.nats)) : Json(nullptr);
    json["bits"] = used ? Json(engine::LogWeight::nats(entry.nats).to_bits()) : Json(nullptr);
    json["basis"] = Json::object();
    json["source"] = Json::object();
    for (std::size_t k = 0; k < weighing.causes.size(); ++k) {
        const std::string& cause = weighing.causes[k].id;
        const likelihoods::EvidenceRow& row = likelihoods::row_of(tables, table, cause);
        if (used) {
            json["log_likelihood"][cause] = entry.log_likelihood[k];
        }
        json["basis"][cause] = document::to_string(row.grounds.basis);
        json["source"][cause] = row.grounds.sources;
    }
    return json;
}

}  // namespace

nlohmann::ordered_json report_json(const Weighing& weighing, const Sensitivity* sensitivity,
                                   const likelihoods::TableSet& tables, const Provenance& provenance) {
    Json report = {{"format", "steelyard.report/1"}, {"case", weighing.panel.case_id}};
    report["urgent"] = urgent_json(weighing, tables);
    report["gate"] = gate_json(weighing);
    report["causes"] = causes_json(weighing);
    if (sensitivity != nullptr) {
        add_intervals(*sensitivity, report["causes"]);
    }
    report["left_out"] = Json::array();
    for (const LeftOut& cause : weighing.left_out) {
        report["left_out"].push_back({{"id", cause.id}, {"title", cause.title}, {"why", cause.why}});
    }
    report["summary"] = {{"separation", separation_sentence(weighing, sensitivity)},
                         {"grounds", grounds_sentence(weighing)}};
    if (sensitivity != nullptr) {
        if (const std::string fit = fit_sentence(weighing, sensitivity->fit); !fit.empty()) {
            report["summary"]["fit"] = fit;
        }
        report["summary"]["cheapest_change"] = cheapest_change_sentence(*sensitivity, tables);
    }
    report["ledger"] = Json::array();
    for (const LedgerEntry& entry : weighing.ledger) {
        report["ledger"].push_back(ledger_entry_json(weighing, tables, entry));
    }
    report["weight_by_basis"] = Json::object();
    for (const auto& [basis, share] : weighing.by_basis.shares) {
        report["weight_by_basis"][std::string(document::to_string(basis))] = share;
    }
    report["missing"] = Json::array();
    report["barred"] = Json::object();
    for (const MissingFinding& finding : weighing.missing) {
        report["missing"].push_back(finding.id);
        if (!finding.barred.empty()) {
            report["barred"][finding.id] = finding.barred;
        }
    }
    report["unread"] = weighing.unread;
    if (sensitivity != nullptr) {
        report["sensitivity"] = sensitivity_json(weighing, *sensitivity);
        report["fit"] = fit_json(weighing, sensitivity->fit);
        report["next"] = next_json(weighing, tables, *sensitivity);
        report["next_pair"] = next_pair_json(*sensitivity);
    }
    report["provenance"] = {{"version", provenance.version},
                            {"tables",
                             {{"title", provenance.tables_title},
                              {"name", provenance.tables_name},
                              {"digest", provenance.tables_digest}}},
                            {"priors",
                             {{"title", provenance.priors_title},
                              {"name", provenance.priors_name},
                              {"digest", provenance.priors_digest}}}};
    if (sensitivity != nullptr) {
        report["provenance"]["seed"] = sensitivity->seed;
        report["provenance"]["draws"] = sensitivity->spread.draws;
    }
    report["caution"] =
        tables.caution.empty() ? std::string(caution_text) : std::string(caution_text) + " " + tables.caution;
    return report;
}

}  // namespace steelyard::cli
