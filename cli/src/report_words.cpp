// SPDX-License-Identifier: Apache-2.0
// Sentences shared by the text and JSON reports.
#include <fmt/format.h>

#include <cmath>

#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/cli/version.hpp"

namespace steelyard::cli {

const char* const caution_text =
    "Decision support for qualified clinicians, for teaching and for audit. It weighs the listed causes "
    "against each other "
    "and is not a diagnosis; it is not a medical device. Local protocols, the patient in front of you and "
    "licensed practice "
    "come first.";

namespace {

std::size_t findings_read(const Weighing& weighing) {
    std::size_t count = 0;
    for (const LedgerEntry& entry : weighing.ledger) {
        count += entry.reading.use == likelihoods::Use::read ? 1U : 0U;
    }
    return count;
}

/// How far apart two causes are, in words. The limits are judgement: 3, 10 and 100 to 1 (docs/method.md,
/// "Words").
std::string_view separation_words(double odds) {
    if (odds < 3.0) {
        return "they are not separated by what is known here";
    }
    if (odds < 10.0) {
        return "they are only weakly separated";
    }
    if (odds < 100.0) {
        return "they are separated, if the tables and priors hold";
    }
    return "they are far apart, if the tables and priors hold";
}

}  // namespace

Provenance provenance_of(const likelihoods::TableSet& tables, const priors::PriorSet& priors) {
    return {std::string(version()), tables.title, tables.name,  tables.digest,
            priors.title,           priors.name,  priors.digest};
}

std::string dumped(const nlohmann::ordered_json& json, int indent) {
    return json.dump(indent, ' ', false, nlohmann::ordered_json::error_handler_t::replace);
}

std::string grounds_in_words(const document::Grounds& grounds) {
    std::string keys;
    for (const std::string& key : grounds.sources) {
        keys += (keys.empty() ? "" : ", ") + visible(key);
    }
    switch (grounds.basis) {
        case document::Basis::elicited:
            return keys.empty() ? "judgement" : fmt::format("judgement (bearing on it: {})", keys);
        case document::Basis::memory:
            return keys.empty() ? "from memory" : fmt::format("from memory ({})", keys);
        case document::Basis::practice:
            return keys.empty() ? "common practice" : fmt::format("common practice ({})", keys);
        default:
            return fmt::format("{} {}", document::to_string(grounds.basis), keys);
    }
}

std::string citation(const document::Source& source) {
    std::string text = visible(source.key) + ": " + visible(source.cite);
    if (!text.ends_with('.')) {
        text += '.';
    }
    if (!source.doi.empty()) {
        text += " doi " + visible(source.doi) + ".";
    }
    if (!source.seen.empty()) {
        text += " Read: " + visible(source.seen) + ".";
    }
    return text;
}

std::string separation_sentence(const Weighing& weighing) {
    if (!weighing.weighed) {
        return "No cause was weighed.";
    }
    if (findings_read(weighing) == 0) {
        return "No finding of this case could be read: these are the prior odds alone.";
    }
    const WeighedCause& leader = weighing.causes[weighing.ranking[0]];
    const WeighedCause& next = weighing.causes[weighing.ranking[1]];
    const double odds = std::exp(weighing.total_nats);
    return fmt::format(
        "Of the causes weighed, \"{}\" carries the most probability; its odds against the next, \"{}\", are "
        "{}: {}.",
        leader.title, next.title, odds_in_words(odds), separation_words(odds));
}

std::string grounds_sentence(const Weighing& weighing) {
    if (!weighing.weighed || weighing.by_basis.shares.empty()) {
        return {};
    }
    double read_somewhere = 0.0;
    double judged = 0.0;
    for (const auto& [basis, share] : weighing.by_basis.shares) {
        (document::is_judged(basis) ? judged : read_somewhere) += share;
    }
    std::string sentence;
    if (judged >= 0.995) {
        sentence =
            "All of the weight of the findings between these two rests on judgement or memory, none on "
            "published figures.";
    } else if (read_somewhere >= 0.995) {
        sentence = "All of the weight of the findings between these two rests on published figures.";
    } else {
        sentence = fmt::format(
            "Of the weight of the findings between these two, {} rests on published figures and {} on "
            "judgement or memory.",
            percent(read_somewhere), percent(judged));
    }
    if (judged > 0.5) {
        sentence += " Take the percentages as a ranking, not as measured chances.";
    }
    return sentence;
}

}  // namespace steelyard::cli
