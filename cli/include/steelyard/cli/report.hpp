// SPDX-License-Identifier: Apache-2.0
#pragma once
// A weighing as text for people and as JSON `steelyard.report/1` for programs.

#include <nlohmann/json.hpp>
#include <string>

#include "steelyard/cli/sensitivity.hpp"

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

/// How much of a report is written as text.
enum class Length {
    brief,     ///< one screen: what is urgent, how likely each cause is, what to look at next
    ordinary,  ///< two screens: what it rests on and what would overturn it besides
    full       ///< everything, with every figure's basis and source
};

/// @param sensitivity  of a weighed case; null leaves out what it says
std::string report_text(const Weighing& weighing, const Sensitivity* sensitivity,
                        const likelihoods::TableSet& tables, const Provenance& provenance, Length length,
                        bool colour);
nlohmann::ordered_json report_json(const Weighing& weighing, const Sensitivity* sensitivity,
                                   const likelihoods::TableSet& tables, const Provenance& provenance);

/// JSON as text. File names need not be UTF-8; bytes that are not become U+FFFD.
std::string dumped(const nlohmann::ordered_json& json, int indent = -1);

/// What a figure rests on, for people: `study batlle-1988`, `judgement (bearing on it: berend-2017)`.
std::string grounds_in_words(const document::Grounds& grounds);

/// `key: citation. doi .... Read: abstract.`, made harmless for a terminal.
std::string citation(const document::Source& source);

/// A cause's title without the bracket that says the same in the field's numbers.
std::string short_title(const WeighedCause& cause);

/// Odds of at least 1, no finer than they are known: `about 6 to 1`, `over 100 to 1`.
std::string rough_odds(double odds);
/// Whether the leader is separated from the next cause, in one plain sentence, never worded as a diagnosis.
std::string separation_sentence(const Weighing& weighing, const Sensitivity* sensitivity);
/// What carries the answer: how much of the weight rests on published figures, how much on judgement. May be
/// empty.
std::string grounds_sentence(const Weighing& weighing);
/// The cheapest thing that could change the answer: a finding not yet known, or a value repeated.
std::string cheapest_change_sentence(const Sensitivity& sensitivity, const likelihoods::TableSet& tables);
/// That the leader does not fit what another cause does; empty otherwise.
std::string fit_sentence(const Weighing& weighing, const Fit& fit);

}  // namespace steelyard::cli
