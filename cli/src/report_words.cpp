// SPDX-License-Identifier: Apache-2.0
// Sentences shared by the text and JSON reports.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <optional>

#include "sensitivity_parts.hpp"
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

/// How far apart two causes are, in words: by their odds, and no further than the draws of tables and priors
/// agree on the leader. The limits are judgement (docs/method.md, "Words").
std::string_view separation_words(double odds, double leads) {
    if (odds < 3.0 || leads < 0.8) {
        return "they are not separated by what is known here";
    }
    if (odds < 10.0 || leads < 0.95) {
        return "they are only weakly separated";
    }
    if (odds < 100.0 || leads < 0.99) {
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

std::string rough_odds(double odds) {
    if (odds >= 100.0) {
        return "over 100 to 1";
    }
    const double step = odds < 10.0 ? 1.0 : 10.0;
    return fmt::format("about {:.0f} to 1", std::max(1.0, std::round(odds / step) * step));
}

std::string separation_sentence(const Weighing& weighing, const Sensitivity* sensitivity) {
    if (!weighing.weighed) {
        return "No cause was weighed.";
    }
    if (findings_read(weighing) == 0) {
        return "No finding of this case could be read: these are the prior odds alone.";
    }
    const std::size_t first = weighing.ranking[0];
    const WeighedCause& leader = weighing.causes[first];
    const WeighedCause& next = weighing.causes[weighing.ranking[1]];
    const double odds = std::exp(weighing.total_nats);
    std::string lead;
    std::string more;
    double leads = 1.0;
    if (sensitivity != nullptr) {
        const Eigen::ArrayXd& all = sensitivity->spread.leads;
        leads = all(static_cast<Eigen::Index>(first));
        lead = fmt::format(" and leads in {} of the draws of tables and priors", percent(leads));
        Eigen::Index most = 0;
        if (all.maxCoeff(&most) > leads) {
            more =
                fmt::format(" \"{}\" leads in more of them ({}).",
                            short_title(weighing.causes[static_cast<std::size_t>(most)]), percent(all(most)));
        }
    }
    return fmt::format(
        R"("{}" carries the most probability of the causes weighed{}; its odds against "{}" are {}: {}.{})",
        short_title(leader), lead, short_title(next), rough_odds(odds), separation_words(odds, leads), more);
}

std::string short_title(const WeighedCause& cause) {
    const std::size_t bracket = cause.title.find(" (");
    return bracket == std::string::npos ? cause.title : cause.title.substr(0, bracket);
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

std::string cheapest_change_sentence(const Sensitivity& sensitivity, const likelihoods::TableSet& tables) {
    constexpr double worth_telling = 0.01;
    // The lightest burden first, and within it the likeliest to change the leader. To repeat a value costs
    // what it cost.
    struct Candidate {
        std::ptrdiff_t burden;
        double chance;
        std::string words;
    };
    std::optional<Candidate> best;
    const auto consider = [&](const std::string& what, const std::string& finding, double chance) {
        const std::string& burden = tables.find_table(finding)->burden;
        const Candidate candidate{std::find(burdens().begin(), burdens().end(), burden) - burdens().begin(),
                                  chance,
                                  fmt::format("{} \"{}\" ({})", what, tables.title_of(finding), burden)};
        const bool better = !best || candidate.burden < best->burden ||
                            (candidate.burden == best->burden && candidate.chance > best->chance);
        if (chance >= worth_telling && better) {
            best = candidate;
        }
    };
    for (const auto* list : {&sensitivity.next, &sensitivity.beyond_burden}) {
        for (const NextTest& test : *list) {
            if (test.bits >
                0.0) {  // one that only takes the place of known evidence is not expected to tell anything
                consider("to look at", test.finding, test.leader_changes);
            }
        }
    }
    for (const ValueEdge& edge : sensitivity.edges) {
        consider("to repeat", edge.finding, edge.chance_other.value_or(0.0));
    }
    if (!best) {
        return "No finding not yet known and no repeated value has a chance of 1 % or more of putting "
               "another cause "
               "first.";
    }
    return fmt::format("The cheapest thing that could put another cause first is {}: chance {}.", best->words,
                       percent(best->chance));
}

std::string fit_sentence(const Weighing& weighing, const Fit& fit) {
    const std::size_t leader = weighing.ranking[0];
    if (!fit.explained || fit.surprise[leader] >= unexplained_below) {
        return {};
    }
    const auto best = static_cast<std::size_t>(std::max_element(fit.surprise.begin(), fit.surprise.end()) -
                                               fit.surprise.begin());
    return fmt::format(
        R"(Under "{}" findings as unusual as these have a chance below 1 %; they go better with "{}" ({}).)",
        short_title(weighing.causes[leader]), short_title(weighing.causes[best]),
        percent(fit.surprise[best]));
}

}  // namespace steelyard::cli
