// SPDX-License-Identifier: Apache-2.0
#include "casebook_views.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <nlohmann/json.hpp>

#include "steelyard/cli/csv_text.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/cli/terminal.hpp"
#include "utc_time.hpp"

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;

std::string counted(std::size_t count, std::string_view word) {
    return fmt::format("{} {}{}", count, word, count == 1 ? "" : "s");
}

std::size_t open_among(const std::vector<CasebookEntry>& entries) {
    return static_cast<std::size_t>(
        std::count_if(entries.begin(), entries.end(),
                      [](const CasebookEntry& entry) { return entry.outcome() == nullptr; }));
}

/// An id for a column; a hash is cut to what tells it from others at a glance.
std::string shown_id(const std::string& id) {
    constexpr std::size_t whole_hash = 71;
    return id.size() == whole_hash && id.starts_with("sha256:") ? id.substr(0, 23) : visible(id);
}

/// What the program said at the time, in words.
std::string said(const CasebookEntry& entry) {
    const CauseAtTheTime* leader = entry.leader();
    if (leader == nullptr) {
        return "not weighed, out of scope";
    }
    const std::string scope =
        entry.gate == "in_scope"
            ? ""
            : fmt::format(", {}", entry.gate == "caution" ? "with caution" : "out of scope, weighed anyway");
    return fmt::format("{} led with {} (prior {}){}", visible(leader->cause), percent(leader->posterior),
                       percent(leader->prior), scope);
}

/// What was found since, in words.
std::string found(const CasebookEntry& entry) {
    const CasebookOutcome* outcome = entry.outcome();
    if (outcome == nullptr) {
        return "no final cause yet";
    }
    std::string text = fmt::format("final cause {}", visible(outcome->final_cause));
    if (outcome->outside) {
        text += " (none of the tables' causes)";
    }
    if (entry.outcomes.size() > 1) {
        text += fmt::format(", amended from {} because: {}",
                            visible(entry.outcomes[entry.outcomes.size() - 2].final_cause),
                            visible(outcome->why));
    }
    return text;
}

std::string age(const CasebookEntry& entry, std::string_view now) {
    const auto days = days_between(entry.recorded, now);
    return days ? fmt::format("{} d", *days) : "?";
}

Json age_json(const CasebookEntry& entry, std::string_view now) {
    const auto days = days_between(entry.recorded, now);
    return days ? Json(*days) : Json(nullptr);
}

Json or_null(const std::string& text) {
    return text.empty() ? Json(nullptr) : Json(text);
}

/// Every cause that some entry weighed, in the order in which they are met.
std::vector<std::string> causes_of(const std::vector<CasebookEntry>& entries) {
    std::vector<std::string> causes;
    for (const CasebookEntry& entry : entries) {
        for (const CauseAtTheTime& cause : entry.causes) {
            if (std::find(causes.begin(), causes.end(), cause.cause) == causes.end()) {
                causes.push_back(cause.cause);
            }
        }
    }
    return causes;
}

std::string line_of(const std::vector<std::string>& fields) {
    std::string line;
    for (const std::string& field : fields) {
        line += (&field == &fields.front() ? "" : ",") + field;
    }
    return line + "\n";
}

Json outcomes_json(const CasebookEntry& entry) {
    Json outcomes = Json::array();
    for (const CasebookOutcome& outcome : entry.outcomes) {
        outcomes.push_back({{"final_cause", outcome.final_cause},
                            {"outside", outcome.outside},
                            {"entered", outcome.entered},
                            {"why", or_null(outcome.why)}});
    }
    return outcomes;
}

}  // namespace

std::string casebook_list_text(const std::string& path, const std::vector<CasebookEntry>& shown,
                               const std::vector<CasebookEntry>& all, bool open_only, std::string_view now,
                               bool colour) {
    const std::size_t open = open_among(all);
    std::string text = wrapped(
        fmt::format("Casebook {}: {}, {} without a final cause{}", visible(path), counted(all.size(), "case"),
                    open, open_only && open < all.size() ? " (--all lists the others too)" : ""),
        "", "  ");
    text += "\n";
    if (shown.empty()) {
        text += "No case to show.\n";
    } else {
        text +=
            emphasised(padded("Case", 56) + padded_left("recorded", 14) + padded_left("ago", 10), colour) +
            "\n";
    }
    for (const CasebookEntry& entry : shown) {
        const std::string when =
            padded_left(visible(entry.recorded.substr(0, 10)), 14) + padded_left(age(entry, now), 10);
        const std::string id = shown_id(entry.case_id);
        if (text_width(id) <= 56) {
            text += padded(id, 56) + when + "\n";
        } else {
            text += wrapped(id, "", "  ") + std::string(56, ' ') + when + "\n";
        }
        const std::string again =
            entry.of > 1 ? fmt::format("; recording {} of {}", entry.place, entry.of) : "";
        text += wrapped(fmt::format("{}; {}{}", said(entry), found(entry), again), "    ", "    ");
    }
    return text + "\n" + wrapped(std::string("Caution: ") + caution_text, "", "  ");
}

std::string casebook_list_csv(const std::vector<CasebookEntry>& shown, std::string_view now) {
    std::string text =
        "case,recorded,age_days,gate,leader,leader_posterior,final_cause,entered,recordings,amendments\n";
    for (const CasebookEntry& entry : shown) {
        const CauseAtTheTime* leader = entry.leader();
        const CasebookOutcome* outcome = entry.outcome();
        const auto days = days_between(entry.recorded, now);
        text += line_of({csv_field(entry.case_id), csv_field(entry.recorded),
                         days ? fmt::format("{}", *days) : "", csv_field(entry.gate),
                         leader == nullptr ? "" : csv_field(leader->cause),
                         leader == nullptr ? "" : fmt::format("{}", leader->posterior),
                         outcome == nullptr ? "" : csv_field(outcome->final_cause),
                         outcome == nullptr ? "" : csv_field(outcome->entered), fmt::format("{}", entry.of),
                         fmt::format("{}", entry.outcomes.empty() ? 0 : entry.outcomes.size() - 1)});
    }
    return text;
}

std::string casebook_list_json(const std::vector<CasebookEntry>& shown, std::string_view now) {
    Json json = {{"format", "steelyard.casebook-list/1"}, {"cases", Json::array()}};
    for (const CasebookEntry& entry : shown) {
        const CauseAtTheTime* leader = entry.leader();
        json["cases"].push_back(
            {{"case", entry.case_id},
             {"recorded", entry.recorded},
             {"age_days", age_json(entry, now)},
             {"gate", entry.gate},
             {"leader", leader == nullptr ? Json(nullptr) : Json(leader->cause)},
             {"leader_posterior", leader == nullptr ? Json(nullptr) : Json(leader->posterior)},
             {"final_cause", entry.outcomes.empty() ? Json(nullptr) : Json(entry.outcome()->final_cause)},
             {"recordings", entry.of},
             {"outcomes", outcomes_json(entry)}});
    }
    json["caution"] = caution_text;
    return dumped(json, 2) + "\n";
}

std::string casebook_csv(const std::vector<CasebookEntry>& entries) {
    const std::vector<std::string> causes = causes_of(entries);
    std::vector<std::string> header = {"case",   "recorded", "recording", "recordings",
                                       "counts", "gate",     "leader"};
    for (const char* kind : {"posterior", "prior"}) {
        for (const std::string& cause : causes) {
            header.push_back(csv_field(fmt::format("{}_{}", kind, cause)));
        }
    }
    for (const char* name :
         {"pattern", "final_cause", "outside", "entered", "amendments", "version", "tables_title",
          "tables_digest", "reading_digest", "priors_title", "priors_digest"}) {
        header.emplace_back(name);
    }
    std::string text = line_of(header);
    for (const CasebookEntry& entry : entries) {
        const CauseAtTheTime* leader = entry.leader();
        std::vector<std::string> fields = {csv_field(entry.case_id),
                                           csv_field(entry.recorded),
                                           fmt::format("{}", entry.place),
                                           fmt::format("{}", entry.of),
                                           entry.counts ? "yes" : "no",
                                           csv_field(entry.gate),
                                           leader == nullptr ? "" : csv_field(leader->cause)};
        for (const auto value : {&CauseAtTheTime::posterior, &CauseAtTheTime::prior}) {
            for (const std::string& id : causes) {
                const auto cause = std::find_if(entry.causes.begin(), entry.causes.end(),
                                                [&](const CauseAtTheTime& one) { return one.cause == id; });
                // The shortest decimal that reads back to the same double.
                fields.push_back(cause == entry.causes.end() ? "" : fmt::format("{}", (*cause).*value));
            }
        }
        const CasebookOutcome* outcome = entry.outcome();
        fields.push_back(csv_field(entry.pattern));
        fields.push_back(outcome == nullptr ? "" : csv_field(outcome->final_cause));
        fields.emplace_back(outcome == nullptr ? "" : outcome->outside ? "yes" : "no");
        fields.push_back(outcome == nullptr ? "" : csv_field(outcome->entered));
        fields.push_back(fmt::format("{}", entry.outcomes.empty() ? 0 : entry.outcomes.size() - 1));
        for (const std::string* part : {&entry.version, &entry.tables_title, &entry.tables_digest,
                                        &entry.reading_digest, &entry.priors_title, &entry.priors_digest}) {
            fields.push_back(csv_field(*part));
        }
        text += line_of(fields);
    }
    return text;
}

std::string casebook_ndjson(const std::vector<CasebookEntry>& entries) {
    std::string text;
    for (const CasebookEntry& entry : entries) {
        const CauseAtTheTime* leader = entry.leader();
        Json json = {{"format", "steelyard.casebook-case/1"},
                     {"case", entry.case_id},
                     {"recorded", entry.recorded},
                     {"recording", entry.place},
                     {"recordings", entry.of},
                     {"counts", entry.counts},
                     {"gate", entry.gate},
                     {"leader", leader == nullptr ? Json(nullptr) : Json(leader->cause)},
                     {"causes", Json::array()}};
        for (const CauseAtTheTime& cause : entry.causes) {
            json["causes"].push_back(
                {{"id", cause.cause}, {"prior", cause.prior}, {"posterior", cause.posterior}});
        }
        json["pattern"] = entry.pattern;
        json["final_cause"] = entry.outcomes.empty() ? Json(nullptr) : Json(entry.outcome()->final_cause);
        json["outcomes"] = outcomes_json(entry);
        json["provenance"] = {{"version", entry.version},
                              {"tables",
                               {{"title", entry.tables_title},
                                {"digest", entry.tables_digest},
                                {"reading_digest", entry.reading_digest}}},
                              {"priors", {{"title", entry.priors_title}, {"digest", entry.priors_digest}}}};
        json["caution"] = caution_text;
        text += dumped(json) + "\n";
    }
    return text;
}

}  // namespace steelyard::cli
