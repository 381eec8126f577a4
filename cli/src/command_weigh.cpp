// SPDX-License-Identifier: Apache-2.0
// steelyard weigh: posterior, what it rests on and how sure it is, for each case.
#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <optional>
#include <ostream>
#include <thread>

#include "batch/batch_weigh.hpp"
#include "batch/result_row.hpp"
#include "exclude.hpp"
#include "open_inputs.hpp"
#include "option_values.hpp"
#include "progress.hpp"
#include "sensitivity_parts.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/read_cases.hpp"
#include "steelyard/cli/report.hpp"

namespace steelyard::cli {
namespace {

constexpr const char* weigh_description =
    "Weigh the causes of a normal-gap metabolic acidosis for each case: urgent values first, then whether "
    "the question "
    "applies, the probability of each cause with its interval, what would overturn it, what to look at next, "
    "and what it "
    "rests on.";

constexpr const char* weigh_footer = R"(Examples:
  steelyard weigh docs/cases/larkmoor-002.yaml
  steelyard weigh case.yaml --priors general-ward
  steelyard weigh case.yaml --brief --burden bedside
  steelyard weigh case.yaml --full --until 0.9 --epsilon 0.1
  steelyard weigh *.yaml --as json --out reports.json
  cat case.yaml | steelyard weigh -
  steelyard weigh ward-2025.csv.gz --out posteriors.csv --rejects unread.csv
  steelyard weigh panels.ndjson --as ndjson --brief | gzip > reports.ndjson.gz

Files of many cases: CSV with one case a row, or NDJSON with one a line (as
.csv, .ndjson, .jsonl, also packed with gzip or zstd). They give one row of CSV
for each case, in their order, unless --as says otherwise. A row that cannot be
read is named on standard error and set aside; the others are weighed.

Exit codes:
  0  every case was read, and at least one was weighed
  2  the command line is wrong
  3  an input is invalid: every fault is listed as file:line:column, and nothing
     is weighed
  4  no case was weighed: all were out of scope
  5  some rows of a file of many cases could not be read and were set aside
 70  an unexpected failure of the program itself)";

/// A share strictly between 0 and 1, or with the ends. @throws UsageError
double share_option(const char* option, const std::string& text, bool with_ends) {
    const double value = number_in_option(
        option, text, 0.0, 1.0,
        fmt::format("a fraction {}, as 0.9 for 90 %", with_ends ? "from 0 to 1" : "between 0 and 1"));
    if (!with_ends && (value == 0.0 || value == 1.0)) {
        throw UsageError(
            fmt::format("{} {}: must be a fraction between 0 and 1, as 0.9 for 90 %", option, text));
    }
    return value;
}

SensitivityOptions sensitivity_options(const WeighCommand& command) {
    SensitivityOptions options;
    options.seed =
        number_in_option<std::uint64_t>("--seed", command.seed, 0, std::numeric_limits<std::uint64_t>::max(),
                                        "a whole number from 0 to 2^64 - 1");
    if (!command.draws.empty()) {
        options.draws = number_in_option<Eigen::Index>("--draws", command.draws, 1000, 1'000'000,
                                                       "a whole number from 1000 to 1000000");
    }
    options.threads =
        command.threads.empty()
            ? static_cast<int>(std::clamp(std::thread::hardware_concurrency(), 1U, 256U))
            : number_in_option("--threads", command.threads, 1, 256, "a whole number from 1 to 256");
    if (!command.epsilon.empty()) {
        options.epsilon = share_option("--epsilon", command.epsilon, true);
    }
    if (!command.until.empty()) {
        options.until = share_option("--until", command.until, false);
    }
    options.burden = command.burden;
    return options;
}

/// A case with what is said about how sure its answer is; nothing of it when it was not weighed.
struct Weighed {
    Weighing weighing;
    std::optional<Sensitivity> sensitivity;

    const Sensitivity* sure() const noexcept { return sensitivity ? &*sensitivity : nullptr; }
};

/// A target that no leader can be asked to reach is a mistake on the command line, not a result.
void check_target(double target, const std::vector<Weighed>& cases) {
    const Weighed* last = nullptr;
    for (const Weighed& one : cases) {
        if (!one.weighing.weighed) {
            continue;
        }
        const WeighedCause& leader = one.weighing.causes[one.weighing.ranking[0]];
        if (target > std::min(leader.prior, leader.posterior)) {
            return;
        }
        last = &one;
    }
    if (last != nullptr) {
        const WeighedCause& leader = last->weighing.causes[last->weighing.ranking[0]];
        throw UsageError(fmt::format(
            "--until {}: not above the prior of the leading cause (\"{}\", {} in {}), so there is nothing to "
            "reach; ask for "
            "a higher posterior",
            plain(target), leader.title, percent(leader.prior), visible(last->weighing.panel.case_id)));
    }
}

std::string write_text(const std::vector<Weighed>& cases, const likelihoods::TableSet& tables,
                       const Provenance& provenance, Length length, bool colour) {
    std::string text;
    for (const Weighed& one : cases) {
        text += (text.empty() ? "" : "\n\n") +
                report_text(one.weighing, one.sure(), tables, provenance, length, colour);
    }
    return text;
}

std::string write_json(const std::vector<Weighed>& cases, const likelihoods::TableSet& tables,
                       const Provenance& provenance, bool one_a_line) {
    if (one_a_line) {
        std::string text;
        for (const Weighed& one : cases) {
            text += dumped(report_json(one.weighing, one.sure(), tables, provenance)) + "\n";
        }
        return text;
    }
    nlohmann::ordered_json all = nlohmann::ordered_json::array();
    for (const Weighed& one : cases) {
        all.push_back(report_json(one.weighing, one.sure(), tables, provenance));
    }
    return dumped(all, 2) + "\n";
}

std::string write_csv(const std::vector<Weighed>& cases, const BatchWork& work) {
    std::vector<LeftOut> left_out;
    const ResultRows rows(work.tables, causes_to_weigh(work.tables, work.priors, work.weigh, left_out),
                          work.weigh.weigh_anyway);
    std::string text = rows.header({});
    for (const Weighed& one : cases) {
        const Weighing& weighing = one.weighing;
        const likelihoods::BatchReading reading =
            likelihoods::batch_reading(work.tables, weighing.pattern, weighing.gate, weighing.urgent);
        add_csv_field(text, weighing.panel.case_id);
        text += rows.pattern_part(reading.code, reading.gate) + "," + rows.urgent_part(reading.urgent) + "\n";
    }
    return text;
}

/// Whether the inputs are files of rows; a run takes one kind. @throws UsageError
bool rows_or_documents(const std::vector<CaseFile>& files, const WeighCommand& command) {
    const auto rows =
        std::count_if(files.begin(), files.end(), [](const CaseFile& file) { return file.form.has_value(); });
    if (rows != 0 && rows != static_cast<std::ptrdiff_t>(files.size())) {
        throw UsageError(
            "files of rows (CSV, NDJSON) and YAML or JSON documents cannot be weighed in one run; give one "
            "kind at a time");
    }
    if (rows == 0) {
        for (const auto& [given, option] :
             {std::pair(!command.rejects.empty(), "--rejects"), std::pair(command.strict, "--strict"),
              std::pair(!command.carry.empty(), "--carry")}) {
            if (given) {
                throw UsageError(fmt::format(
                    "{} is for files of rows (CSV, NDJSON); of a YAML or JSON document all cases must be "
                    "readable",
                    option));
            }
        }
    } else if (!command.until.empty()) {
        throw UsageError(
            "--until is for YAML and JSON documents: each leading cause has a target of its own");
    }
    return rows != 0;
}

std::vector<likelihoods::Panel> load_documents(const std::vector<std::string>& paths,
                                               std::vector<CaseFile>& files,
                                               const likelihoods::FeatureVocabulary& vocabulary,
                                               document::Diagnostics& faults) {
    std::string standard_input;
    bool taken = false;
    for (CaseFile& file : files) {
        if (file.stream) {
            standard_input = rest_of(*file.stream);
            taken = true;
        }
    }
    return load_cases(paths, vocabulary, faults, taken ? &standard_input : nullptr);
}

/// The cases of documents: all are read before any is weighed, and all reports are written together.
int weigh_documents(std::vector<likelihoods::Panel> panels, const BatchWork& work, const Streams& streams) {
    SensitivityOptions options = work.sensitivity;
    std::vector<Weighed> cases;
    std::size_t weighed = 0;
    for (likelihoods::Panel& panel : panels) {
        cases.push_back({weigh_case(work.tables, work.priors, std::move(panel), work.weigh), std::nullopt});
        weighed += cases.back().weighing.weighed ? 1U : 0U;
    }
    if (options.until) {
        check_target(*options.until, cases);
    }
    if (work.as != "csv" && !work.brief) {
        Progress progress(streams.err, streams.terminal_err);
        const auto count = static_cast<double>(weighed);
        double done_before = 0.0;
        for (Weighed& one : cases) {
            if (one.weighing.weighed) {
                options.progress = [&](double done) {
                    progress.tell(fmt::format("case {:.0f} of {:.0f}", done_before + 1.0, count),
                                  (done_before + done) / count);
                };
                one.sensitivity = sensitivity_of(work.tables, work.priors, one.weighing, options);
                ++done_before;
            }
        }
    }
    const bool to_file = !work.out.empty() && work.out != "-";
    std::string text;
    if (work.as == "text") {
        text = write_text(cases, work.tables, work.provenance, work.length, streams.colour_out && !to_file);
    } else if (work.as == "csv") {
        text = write_csv(cases, work);
    } else {
        text = write_json(cases, work.tables, work.provenance, work.as == "ndjson");
    }
    write_result(work.out, text, streams.out);
    for (const Weighed& one : cases) {
        if (!one.weighing.weighed) {
            streams.err << wrapped(
                fmt::format("steelyard: {} was not weighed, it is out of scope: {}",
                            visible(one.weighing.panel.case_id), visible(one.weighing.gate.reasons.front())),
                "", "  ");
        }
    }
    return weighed == 0 ? nothing_weighed : done;
}

}  // namespace

CLI::App* setup(CLI::App& app, WeighCommand& command) {
    CLI::App* weigh = app.add_subcommand("weigh", weigh_description);
    weigh->footer(weigh_footer);
    weigh
        ->add_option(
            "CASES", command.cases,
            "Case files, YAML or JSON, or files of many cases, CSV or NDJSON; - reads standard input")
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
    CLI::Option* brief = weigh->add_flag(
        "--brief", command.brief,
        "One screen of text: urgent values, probabilities, what to look at next. JSON without intervals and "
        "sensitivity");
    weigh
        ->add_flag("--full", command.full,
                   "All of the text: every sensitivity, every figure's basis and source")
        ->excludes(brief);
    weigh
        ->add_option(
            "--burden", command.burden,
            "Of what to look at next, only what asks at most this much: bedside, routine or specialised")
        ->capture_default_str()
        ->check(CLI::IsMember(burdens()))
        ->type_name("HOW_MUCH");
    weigh
        ->add_option("--until", command.until,
                     "Also tell at which prior the leading cause has this posterior, as 0.9")
        ->type_name("POSTERIOR");
    weigh
        ->add_option(
            "--epsilon", command.epsilon,
            "Also tell the range of each posterior when this share of the prior may be anything, as 0.1")
        ->type_name("SHARE");
    weigh
        ->add_option("--draws", command.draws,
                     "Draws of tables and priors for the intervals, 1000 to 1000000; as many as the interval "
                     "ends need "
                     "when not given")
        ->type_name("N");
    weigh->add_option("--seed", command.seed, "Seed of the draws; the same seed gives the same report")
        ->capture_default_str()
        ->type_name("N");
    weigh
        ->add_option(
            "--threads", command.threads,
            "Threads to draw on, 1 to 256; all of the machine's when not given. No result depends on it")
        ->type_name("N");
    weigh
        ->add_option("--as", command.as,
                     "How to write the result: text, json (an array), ndjson (a line each) or csv (a row "
                     "each); text for YAML and JSON documents and csv for files of rows when not given")
        ->check(CLI::IsMember({"text", "json", "ndjson", "csv"}))
        ->type_name("FORM");
    weigh
        ->add_option("--from", command.from,
                     "How the cases are written: yaml, json, csv or ndjson; auto tells it from the name, or "
                     "from the first line")
        ->capture_default_str()
        ->check(CLI::IsMember(input_forms()))
        ->type_name("FORM");
    weigh
        ->add_option("--carry", command.carry,
                     "A column of the file to copy to the result as it is. May be repeated")
        ->type_name("COLUMN")
        ->expected(1)
        ->take_all();
    weigh
        ->add_option("--rejects", command.rejects,
                     "Write the rows that cannot be read to this CSV file: place, value and reason of each")
        ->type_name("FILE");
    weigh->add_flag("--strict", command.strict,
                    "Stop at the first row that cannot be read, and write nothing to --out");
    weigh->add_option("-o,--out", command.out, "Write the result to this file, whole or not at all")
        ->type_name("FILE");
    return weigh;
}

int run(const WeighCommand& command, const Streams& streams) {
    SensitivityOptions options = sensitivity_options(command);
    document::Diagnostics faults;
    const auto tables = open_tables(command.tables, faults);
    const auto all_priors =
        open_priors(command.priors, tables ? cause_ids(*tables) : std::vector<std::string>{}, faults);
    std::vector<CaseFile> files;
    for (const std::string& path : command.cases) {
        files.push_back(look_at(path, command.from));
    }
    const bool rows = rows_or_documents(files, command);
    std::vector<likelihoods::Panel> panels;
    if (tables && !rows) {
        panels = load_documents(command.cases, files, tables->vocabulary(), faults);
    }
    if (tables && all_priors) {
        check_composites(*tables, *all_priors, faults);
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    const priors::PriorSet priors = without_excluded(*all_priors, *tables, command.exclude);
    Length length = Length::ordinary;
    if (command.brief || command.full) {
        length = command.brief ? Length::brief : Length::full;
    }
    const std::string as = command.as.empty() ? (rows ? "csv" : "text") : command.as;
    const BatchWork work{*tables,
                         priors,
                         provenance_of(*tables, priors),
                         {command.weigh_anyway, command.exclude},
                         options,
                         command.brief && as != "text",
                         length,
                         as,
                         command.out,
                         command.rejects,
                         command.strict,
                         {command.carry, {}, {}},
                         options.threads};
    return rows ? weigh_rows(std::move(files), work, streams)
                : weigh_documents(std::move(panels), work, streams);
}

}  // namespace steelyard::cli
