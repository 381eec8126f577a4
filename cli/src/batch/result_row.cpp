// SPDX-License-Identifier: Apache-2.0
#include "result_row.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "steelyard/cli/csv_text.hpp"

namespace steelyard::cli {

using likelihoods::GateStatus;

ResultRows::ResultRows(const likelihoods::TableSet& tables, const std::vector<WeighedCause>& causes,
                       bool weigh_anyway)
    : tables_(tables), scorer_(tables, causes), weigh_anyway_(weigh_anyway) {}

std::string ResultRows::header(const std::vector<std::string>& carried) const {
    std::string line = "case";
    for (const std::string& cause : scorer_.model().causes()) {
        line += "," + csv_field(cause);
    }
    line += ",leader,gate,set_aside,urgent";
    for (const std::string& name : carried) {
        line += "," + csv_field(name);
    }
    return line + "\n";
}

std::string ResultRows::pattern_part(std::string_view code, GateStatus gate) const {
    std::string text;
    const PatternScore score = scorer_.score(code);
    for (const double posterior : score.posterior) {
        text += is_weighed(gate) ? fmt::format(",{}", posterior) : std::string(",");
    }
    text += ",";
    text += is_weighed(gate) ? csv_field(scorer_.model().causes()[score.leader]) : std::string();
    text += ",";
    text += likelihoods::to_string(gate);
    text += ",";
    for (std::size_t i = 0; i < score.aside.size(); ++i) {
        text += (i > 0 ? ";" : "") + tables_.tables[score.aside[i]].finding;
    }
    return text;
}

std::string ResultRows::urgent_part(std::uint64_t urgent) const {
    std::string text;
    for (std::size_t i = 0; urgent != 0; ++i, urgent >>= 2U) {
        for (const std::uint64_t side : {1U, 2U}) {
            if ((urgent & side) != 0) {
                text += text.empty() ? "" : ";";
                text += tables_.urgent[i].quantity + (side == 1U ? " low" : " high");
            }
        }
    }
    return text;
}

RowWriter::RowWriter(const ResultRows& rows, SharedTexts& shared)
    : rows_(rows), shared_(shared), met_(remembered) {}

void RowWriter::add(std::string& out, std::string_view case_id, const likelihoods::BatchReading& reading) {
    add_csv_field(out, case_id);
    key_.assign(reading.code);
    key_ += static_cast<char>(reading.gate);
    const std::size_t hash = std::hash<std::string>{}(key_);
    Met& met = met_[hash % remembered];
    if (met.entry == nullptr || met.hash != hash || met.entry->key != key_) {
        const auto make = [&] { return rows_.pattern_part(reading.code, reading.gate); };
        if (const SharedTexts::Entry* entry = shared_.get(key_, hash, make)) {
            met = {hash, entry};
        } else {
            out += make();
            add_urgent(out, reading.urgent);
            return;
        }
    }
    out += met.entry->text;
    add_urgent(out, reading.urgent);
}

void RowWriter::add_urgent(std::string& out, std::uint64_t urgent) const {
    out += ',';
    if (urgent != 0) {
        out += rows_.urgent_part(urgent);
    }
}

void add_csv_field(std::string& out, std::string_view text) {
    const auto plain = [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '-' ||
               c == '_' || c == '.' || c == ' ';
    };
    if (!text.starts_with('-') && std::all_of(text.begin(), text.end(), plain)) {
        out += text;
    } else {
        out += csv_field(text);
    }
}

}  // namespace steelyard::cli
