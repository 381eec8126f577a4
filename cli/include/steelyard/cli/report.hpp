// SPDX-License-Identifier: Apache-2.0
#pragma once
// A weighing as text for people and as JSON `steelyard.report/1` for programs.

#include <nlohmann/json.hpp>
#include <string>

#include "steelyard/cli/weighing.hpp"

namespace steelyard::cli {

/// Where a report comes from; the same for all cases of a run.
struct Provenance {
    std::string version;
    std::string tables_title, tables_name, tables_digest;
    std::string priors_title, priors_name, priors_digest;
};
Provenance provenance_of(const likelihoods::TableSet& tables, const priors::PriorSet& priors);

/// The caution that stands in every output.
extern const char* const caution_text;

std::string report_text(const Weighing& weighing, const likelihoods::TableSet& tables,
                        const Provenance& provenance, bool colour);
nlohmann::ordered_json report_json(const Weighing& weighing, const likelihoods::TableSet& tables,
                                   const Provenance& provenance);

/// JSON as text. File names need not be UTF-8; bytes that are not become U+FFFD.
std::string dumped(const nlohmann::ordered_json& json, int indent = -1);

/// What a figure rests on, for people: `study batlle-1988`, `judgement (bearing on it: berend-2017)`.
std::string grounds_in_words(const document::Grounds& grounds);

/// `key: citation. doi .... Read: abstract.`, made harmless for a terminal.
std::string citation(const document::Source& source);

/// What the answer amounts to in one or two plain sentences, never worded as a diagnosis.
std::string separation_sentence(const Weighing& weighing);
std::string grounds_sentence(const Weighing& weighing);

}  // namespace steelyard::cli
