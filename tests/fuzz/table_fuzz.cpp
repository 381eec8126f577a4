// SPDX-License-Identifier: Apache-2.0
// Any bytes as a table set: only LoadError may escape, and a set that loads keeps what its type promises.
//
// The bytes are a set in one text: files one after another, each after a line `--- NAME`. Text before the
// first such line takes the place of one evidence table beside a small set, so that plain YAML reaches the
// rows at once.
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/evidence_markdown.hpp"
#include "steelyard/likelihoods/pattern.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"

namespace {

using steelyard::document::NamedText;

void require(bool holds) {
    if (!holds) {
        std::abort();
    }
}

constexpr std::string_view small_set = R"(format: steelyard.table-set/1
title: Fuzz
causes:
  north: {title: North}
  south: {title: South}
  both: {title: Both, parts: [north, south], takes: {thirst: south}, otherwise: north}
findings: [thirst]
features:
  alkali: {title: Alkali, levels: [present, absent]}
gate:
  bicarbonate_low: {value: 22 mmol/L, basis: practice}
  ph_low: {value: 7.35, basis: practice}
  ph_high: {value: 7.45, basis: practice}
  gap_normal_to: {value: 12 mmol/L, basis: practice}
  gap_high_from: {value: 16 mmol/L, basis: practice}
  gfr_reduced_below: {value: "45 mL/min/{1.73_m2}", basis: practice}
  expected_pco2_band: {value: 2 mmHg, basis: practice}
  gas_bicarbonate: {value: 2 mmol/L, basis: practice}
  gas_ph: {value: 0.04, basis: practice}
  age_least: {value: 18 a, basis: practice}
  albumin_reference: {value: 40 g/L, basis: practice}
  albumin_slope: {value: 0.25, basis: practice}
  anion_gap_reference: {value: 10, basis: practice}
  bicarbonate_reference: {value: 24, basis: practice}
  expected_pco2_slope: {value: 1.5, basis: practice}
  expected_pco2_intercept: {value: 8, basis: practice}
  alkali_feature: alkali
)";

std::vector<NamedText> files_of(std::string_view text) {
    constexpr std::string_view mark = "--- ";
    std::vector<NamedText> files;
    if (!text.starts_with(mark)) {
        // Whatever finding the text is about is the one the set lists.
        std::string set(small_set);
        const std::string_view key = "\nfinding: ";
        if (const std::size_t at = text.find(key); at != std::string_view::npos) {
            const std::size_t from = at + key.size();
            std::string_view finding = text.substr(from, text.find_first_of("\r\n #", from) - from);
            if (!finding.empty() && finding.size() < 64 &&
                finding.find_first_of("[]{},:\"'") == std::string_view::npos) {
                const std::size_t in_set = set.find("[thirst]");
                set.replace(in_set + 1, 6, finding);
                set.replace(set.find("thirst: south"), 6, finding);
            }
        }
        files.emplace_back("set.yaml", std::move(set));
        files.emplace_back("table.yaml", text);
        return files;
    }
    while (text.starts_with(mark) && files.size() < 16) {
        const std::size_t name_end = std::min(text.find('\n'), text.size());
        const std::string name(text.substr(mark.size(), name_end - mark.size()));
        text.remove_prefix(std::min(name_end + 1, text.size()));
        const std::size_t next = text.starts_with(mark) ? 0 : text.find("\n--- ");
        const std::size_t end = next == std::string_view::npos ? text.size() : next + (next == 0 ? 0 : 1);
        files.emplace_back(name, text.substr(0, end));
        text.remove_prefix(end);
    }
    return files;
}

void check_promises(const steelyard::likelihoods::TableSet& set) {
    std::vector<std::string> causes;
    for (const auto& cause : set.causes) {
        causes.push_back(cause.id);
    }
    require(causes.size() >= 2);
    for (const auto& table : set.tables) {
        require(table.bands() >= 2);
        const Eigen::ArrayXXd bands = steelyard::likelihoods::band_probabilities(set, table, causes);
        require((bands > 0.0).all() && (bands < 1.0).all());
        require(((bands.colwise().sum() - 1.0).abs() < 1e-12).all());
    }
    require(!steelyard::likelihoods::evidence_markdown(set).empty());
    const steelyard::likelihoods::Panel nothing;
    const auto pattern =
        steelyard::likelihoods::read_pattern(set, nothing, steelyard::likelihoods::derive(nothing));
    require(pattern.findings.size() == set.tables.size());
}

}  // namespace

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    const std::string text(data, data + size);  // a length of 0 may come with a null pointer
    try {
        check_promises(steelyard::likelihoods::read_table_set(files_of(text), "fuzz"));
    } catch (const steelyard::document::LoadError& error) {
        require(!error.faults().empty());
    }
    return 0;
}
