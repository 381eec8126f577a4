// SPDX-License-Identifier: Apache-2.0
// steelyard weigh: posterior and ledger for each case.
#include <fmt/format.h>

#include <algorithm>
#include <ostream>

#include "open_inputs.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/read_cases.hpp"
#include "steelyard/cli/report.hpp"

namespace steelyard::cli {
namespace {

constexpr const char* weigh_description =
    "Weigh the causes of a normal-gap metabolic acidosis for each case: urgent values first, then whether "
    "the question "
    "applies, the probability of each cause, what that rests on, what was set aside and what is missing.";

constexpr const char* weigh_footer = R"(Examples:
  steelyard weigh docs/cases/larkmoor-002.yaml
  steelyard weigh case.yaml --priors general-ward
  steelyard weigh *.yaml --as json --out reports.json
  cat case.yaml | steelyard weigh -

Exit codes:
  0  every case was read, and at least one was weighed
  2  the command line is wrong
  3  an input is invalid: every fault is listed as file:line:column, and nothing
     is weighed
  4  no case was weighed: all were out of scope
 70  an unexpected failure of the program itself)";

/// The prior set less the causes excluded on the command line.
priors::PriorSet without_excluded(const priors::PriorSet& set, const likelihoods::TableSet& tables,
                                  const std::vector<std::string>& excluded) {
    std::vector<std::string> present;
    for (const std::string& cause : excluded) {
        if (tables.find_cause(cause) == nullptr) {
            throw UsageError(fmt::format("--exclude {}: the tables have no such cause{}", visible(cause),
                                         suggestion(cause, cause_ids(tables))));
        }
        if (set.find(cause) != nullptr && std::find(present.begin(), present.end(), cause) == present.end()) {
            present.push_back(cause);
        }
    }
    if (set.causes.size() < present.size() + 2) {
        throw UsageError("--exclude leaves fewer than two causes: there is nothing to weigh them against");
    }
    return present.empty() ? set : priors::without(set, present);
}

std::string write_text(const std::vector<Weighing>& weighings, const likelihoods::TableSet& tables,
                       const Provenance& provenance, bool colour) {
    std::string text;
    for (const Weighing& weighing : weighings) {
        text += (text.empty() ? "" : "\n\n") + report_text(weighing, tables, provenance, colour);
    }
    return text;
}

std::string write_json(const std::vector<Weighing>& weighings, const likelihoods::TableSet& tables,
                       const Provenance& provenance, bool one_a_line) {
    if (one_a_line) {
        std::string text;
        for (const Weighing& weighing : weighings) {
            text += dumped(report_json(weighing, tables, provenance)) + "\n";
        }
        return text;
    }
    nlohmann::ordered_json all = nlohmann::ordered_json::array();
    for (const Weighing& weighing : weighings) {
        all.push_back(report_json(weighing, tables, provenance));
    }
    return dumped(all, 2) + "\n";
}

}  // namespace

CLI::App* setup(CLI::App& app, WeighCommand& command) {
    CLI::App* weigh = app.add_subcommand("weigh", weigh_description);
    weigh->footer(weigh_footer);
    weigh->add_option("CASES", command.cases, "Case files, YAML or JSON; - reads standard input")
        ->required()
        ->type_name("FILE");
    weigh->add_option("-p,--priors", command.priors, "Prior set: the name of a shipped set, or a file")
        ->capture_default_str()
        ->type_name("SET");
    weigh
        ->add_option("-t,--tables", command.tables, "Evidence tables: the name of a shipped set, or a folder")
        ->capture_default_str()
        ->type_name("SET");
    weigh
        ->add_option("-x,--exclude", command.exclude,
                     "Leave a cause out; the others keep their proportions. May be repeated")
        ->type_name("CAUSE")
        ->expected(1)
        ->take_all();
    weigh->add_flag("--weigh-anyway", command.weigh_anyway,
                    "Weigh a case that is out of scope, saying so in the report");
    weigh
        ->add_option("--as", command.as,
                     "How to write the result: text, json (an array) or ndjson (a line each)")
        ->capture_default_str()
        ->check(CLI::IsMember({"text", "json", "ndjson"}))
        ->type_name("FORM");
    weigh->add_option("-o,--out", command.out, "Write the result to this file, whole or not at all")
        ->type_name("FILE");
    return weigh;
}

int run(const WeighCommand& command, const Streams& streams) {
    document::Diagnostics faults;
    const auto tables = open_tables(command.tables, faults);
    const auto all_priors =
        open_priors(command.priors, tables ? cause_ids(*tables) : std::vector<std::string>{}, faults);
    std::vector<likelihoods::Panel> panels;
    if (tables) {
        panels = load_cases(command.cases, tables->vocabulary(), faults);
    }
    if (tables && all_priors) {
        check_composites(*tables, *all_priors, faults);
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    const priors::PriorSet priors = without_excluded(*all_priors, *tables, command.exclude);
    const Provenance provenance = provenance_of(*tables, priors);

    std::vector<Weighing> weighings;
    std::size_t weighed = 0;
    for (likelihoods::Panel& panel : panels) {
        weighings.push_back(
            weigh_case(*tables, priors, std::move(panel), {command.weigh_anyway, command.exclude}));
        weighed += weighings.back().weighed ? 1U : 0U;
    }
    const bool to_file = !command.out.empty() && command.out != "-";
    const std::string text = command.as == "text"
                                 ? write_text(weighings, *tables, provenance, streams.colour_out && !to_file)
                                 : write_json(weighings, *tables, provenance, command.as == "ndjson");
    write_result(command.out, text, streams.out);
    for (const Weighing& weighing : weighings) {
        if (!weighing.weighed) {
            streams.err << wrapped(
                fmt::format("steelyard: {} was not weighed, it is out of scope: {}",
                            visible(weighing.panel.case_id), visible(weighing.gate.reasons.front())),
                "", "  ");
        }
    }
    return weighed == 0 ? nothing_weighed : done;
}

}  // namespace steelyard::cli
