// SPDX-License-Identifier: Apache-2.0
// steelyard priors: look at a clinic's prior odds.
#include <fmt/format.h>

#include <cmath>
#include <nlohmann/json.hpp>
#include <ostream>

#include "open_inputs.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/priors/prior_set_markdown.hpp"

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;

std::string priors_text(const priors::PriorSet& set, const likelihoods::TableSet& tables, bool colour) {
    std::string text =
        wrapped(fmt::format("{} ({}, {})", visible(set.title), visible(set.name), set.digest.substr(0, 23)),
                "", "  ");
    if (!set.note.empty()) {
        text += wrapped(visible(set.note), "", "");
    }
    text += "\n" +
            emphasised(padded("Cause", 47) + padded_left("prior", 7) + padded_left("as given", 10) +
                           padded_left("range", 16),
                       colour) +
            "\n";
    for (const priors::PriorCause& cause : set.causes) {
        text += padded(visible(tables.title_of(cause.id)), 47) + padded_left(percent(cause.probability), 7) +
                padded_left(visible(cause.as_given), 10) +
                padded_left(cause.range_as_given.empty() ? "none given" : visible(cause.range_as_given), 16) +
                "\n";
        const std::string grounds = cause.grounds ? grounds_in_words(*cause.grounds) : "no basis given";
        text += wrapped(cause.note.empty() ? grounds : grounds + ": " + visible(cause.note), "    ", "    ");
    }
    text += "\n";
    if (set.worth > 0.0) {
        text += wrapped(
            fmt::format("The set is worth {} patients: that many of the clinic's own would weigh as much.",
                        plain(set.worth)),
            "", "");
    }
    for (const document::Source& source : set.sources) {
        text += wrapped(citation(source), "  ", "    ");
    }
    std::string names;
    for (const std::string& name : priors::shipped_prior_sets()) {
        names += (names.empty() ? "" : ", ") + name;
    }
    text += wrapped("Shipped sets: " + names, "", "  ");
    return text + wrapped(std::string("Caution: ") + caution_text, "", "  ");
}

Json priors_json(const priors::PriorSet& set, const likelihoods::TableSet& tables) {
    Json json = {{"format", "steelyard.priors/1"},
                 {"title", set.title},
                 {"name", set.name},
                 {"digest", set.digest},
                 {"given_as", priors::to_string(set.given_as)},
                 {"worth", set.worth},
                 {"note", set.note}};
    json["causes"] = Json::array();
    for (const priors::PriorCause& cause : set.causes) {
        Json entry = {{"id", cause.id},
                      {"title", tables.title_of(cause.id)},
                      {"prior", cause.probability},
                      {"as_given", cause.as_given}};
        entry["range"] = cause.range_low ? Json::array({*cause.range_low, *cause.range_high}) : Json(nullptr);
        entry["basis"] = cause.grounds ? Json(document::to_string(cause.grounds->basis)) : Json(nullptr);
        entry["source"] = cause.grounds ? Json(cause.grounds->sources) : Json::array();
        entry["note"] = cause.note;
        json["causes"].push_back(std::move(entry));
    }
    json["shipped"] = priors::shipped_prior_sets();
    json["caution"] = caution_text;
    return json;
}

}  // namespace

CLI::App* setup(CLI::App& app, PriorsCommand& command) {
    CLI::App* priors = app.add_subcommand("priors", "Look at a clinic's prior odds");
    priors->require_subcommand(1);
    CLI::App* show = priors->add_subcommand("show",
                                            "Show a prior set: the probability of each cause before any "
                                            "finding, as given, with its range and what it rests on");
    show->add_option("SET", command.show.priors, "A shipped set by name, or a file")->capture_default_str();
    show->add_option("-t,--tables", command.show.tables,
                     "The tables whose causes it must name: a shipped set, or a folder")
        ->capture_default_str()
        ->type_name("SET");
    show->add_option("--as", command.show.as, "How to write it: text, json or markdown")
        ->capture_default_str()
        ->check(CLI::IsMember({"text", "json", "markdown"}))
        ->type_name("FORM");
    show->add_option("-o,--out", command.show.out, "Write to this file, whole or not at all")
        ->type_name("FILE");
    show->footer(
        "Examples:\n  steelyard priors show\n  steelyard priors show general-ward\n  steelyard priors show "
        "ours.yaml --as json\n\n"
        "Exit codes: 0 done, 2 wrong command line, 3 the set is invalid.");
    return priors;
}

int run(const PriorsShowCommand& command, const Streams& streams) {
    document::Diagnostics faults;
    const auto tables = open_tables(command.tables, faults);
    const auto set =
        open_priors(command.priors, tables ? cause_ids(*tables) : std::vector<std::string>{}, faults);
    if (tables && set) {
        check_composites(*tables, *set, faults);
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    std::string text;
    if (command.as == "json") {
        text = dumped(priors_json(*set, *tables), 2) + "\n";
    } else if (command.as == "markdown") {
        text = priors::priors_markdown(*set);
    } else {
        text = priors_text(*set, *tables, streams.colour_out && command.out.empty());
    }
    write_result(command.out, text, streams.out);
    return done;
}

}  // namespace steelyard::cli
