// SPDX-License-Identifier: Apache-2.0
// steelyard audit: past posteriors held against final diagnoses.
#include <fmt/format.h>

#include <algorithm>
#include <filesystem>
#include <limits>
#include <ostream>
#include <thread>

#include "exclude.hpp"
#include "open_inputs.hpp"
#include "option_values.hpp"
#include "progress.hpp"
#include "steelyard/cli/audit.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/tally_file.hpp"
#include "tally_inputs.hpp"

namespace steelyard::cli {
namespace {

constexpr const char* audit_description =
    "Hold probabilities against final diagnoses: whether they can be believed, for which causes there are "
    "too "
    "few patients to tell, how well causes are told apart, by stratum and over time, with intervals. Reads "
    "files of many cases with a column final_cause, and tallies, which any number of sites can make from "
    "their own cases and add up.";

constexpr const char* audit_footer = R"(Examples:
  steelyard audit ward-2025.csv.gz --keep-tally 2025.tally
  steelyard audit ward-2025.csv --by ward --over sampled_on
  steelyard audit 2025.tally
  steelyard audit north.tally south.tally --priors general-ward
  steelyard audit 2025.tally --against even
  steelyard audit 2025.tally --cause classic_distal --threshold 0.1
  steelyard audit 2025.tally --estimate-dependence --write-groups groups.yaml
  steelyard audit 2025.tally --as csv --out audit.csv
  steelyard audit a.tally b.tally --keep-tally both.tally --least-cell 5

Exit codes:
  0  done
  2  the command line is wrong, or a result could not be written
  3  an input is invalid: every fault is listed as file:line:column, and nothing
     is done
  4  no patient has a final cause among those weighed; the counts are written
  5  some rows could not be read and were set aside; the others were audited
 70  an unexpected failure of the program itself)";

/// Where net benefit is shown when no threshold is given: from "worth a cheap test" to "worth treating".
const std::vector<double> usual_thresholds = {0.05, 0.1, 0.2, 0.3, 0.5};

AuditAsked asked_for(const AuditCommand& command) {
    AuditAsked asked;
    asked.level = number_in_option("--level", command.level, 0.5, 0.999,
                                   "a fraction from 0.5 to 0.999, as 0.95 for 95 % intervals");
    asked.replicates = number_in_option<Eigen::Index>("--replicates", command.replicates, 20, 1'000'000,
                                                      "a whole number from 20 to 1000000");
    asked.seed =
        number_in_option<std::uint64_t>("--seed", command.seed, 0, std::numeric_limits<std::uint64_t>::max(),
                                        "a whole number from 0 to 2^64 - 1");
    asked.bins =
        number_in_option<Eigen::Index>("--bins", command.bins, 2, 100, "a whole number from 2 to 100");
    asked.threads =
        command.threads.empty()
            ? static_cast<int>(std::clamp(std::thread::hardware_concurrency(), 1U, 256U))
            : number_in_option("--threads", command.threads, 1, 256, "a whole number from 1 to 256");
    asked.dependence = command.estimate_dependence || !command.write_groups.empty();
    asked.cause = command.cause;
    for (const std::string& threshold : command.thresholds) {
        asked.thresholds.push_back(number_in_option("--threshold", threshold, 0.001, 0.999,
                                                    "a fraction from 0.001 to 0.999, as 0.1 for 10 %"));
    }
    if (command.cause.empty() && !asked.thresholds.empty()) {
        throw UsageError("--threshold needs --cause: of which cause is it a probability?");
    }
    if (!command.cause.empty() && asked.thresholds.empty()) {
        asked.thresholds = usual_thresholds;
    }
    std::sort(asked.thresholds.begin(), asked.thresholds.end());
    asked.thresholds.erase(std::unique(asked.thresholds.begin(), asked.thresholds.end()),
                           asked.thresholds.end());
    return asked;
}

/// What --against names: a prior set or a table set.
struct Against {
    std::optional<likelihoods::TableSet> tables;
    std::optional<priors::PriorSet> priors;

    bool given() const noexcept { return tables || priors; }
    AuditAgainst pointers() const { return {tables ? &*tables : nullptr, priors ? &*priors : nullptr}; }
};

bool names_tables(const std::string& name) {
    const std::vector<std::string> shipped = likelihoods::shipped_table_sets();
    constexpr std::string_view prefix = "shipped:";
    const std::string plain = name.starts_with(prefix) ? name.substr(prefix.size()) : name;
    std::error_code ignored;
    return std::find(shipped.begin(), shipped.end(), plain) != shipped.end() ||
           std::filesystem::is_directory(name, ignored);
}

std::vector<std::string> sorted_ids(const likelihoods::TableSet& tables, const priors::PriorSet& priors) {
    std::vector<std::string> ids;
    for (const likelihoods::Cause& cause : tables.causes) {
        if (priors.find(cause.id) != nullptr) {
            ids.push_back(cause.id);
        }
    }
    std::sort(ids.begin(), ids.end());
    return ids;
}

/// The causes that both sides of a comparison weigh must be the same: otherwise their probabilities are of
/// different things.
void check_same_causes(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                       const likelihoods::TableSet& other_tables, const priors::PriorSet& other_priors) {
    const std::vector<std::string> first = sorted_ids(tables, priors);
    const std::vector<std::string> second = sorted_ids(other_tables, other_priors);
    std::vector<std::string> apart;
    std::set_symmetric_difference(first.begin(), first.end(), second.begin(), second.end(),
                                  std::back_inserter(apart));
    if (!apart.empty()) {
        std::string list;
        for (const std::string& cause : apart) {
            list += (list.empty() ? "" : ", ") + cause;
        }
        throw UsageError(
            fmt::format("--against weighs other causes, and probabilities over different causes cannot be "
                        "compared; leave "
                        "out with --exclude what only one of them weighs: {}",
                        list));
    }
}

Against open_against(const AuditCommand& command, const likelihoods::TableSet& tables,
                     document::Diagnostics& faults) {
    Against against;
    if (command.against.empty()) {
        return against;
    }
    if (names_tables(command.against)) {
        against.tables = open_tables(command.against, faults);
    } else {
        against.priors = open_priors(command.against, cause_ids(tables), faults);
        if (against.priors) {
            check_composites(tables, *against.priors, faults);
        }
    }
    return against;
}

/// Tables to compare with must read the same bands and know the causes weighed.
void check_against(const Against& against, const likelihoods::TableSet& tables,
                   const priors::PriorSet& priors) {
    if (against.tables) {
        if (likelihoods::reading_digest(*against.tables) != likelihoods::reading_digest(tables)) {
            throw UsageError(
                "--against: these tables read other bands, conditions or gate limits, so the same patterns "
                "cannot be "
                "weighed under both");
        }
        check_same_causes(tables, priors, *against.tables, priors);
    } else if (against.priors) {
        check_same_causes(tables, priors, tables, *against.priors);
    }
}

std::string written(const AuditCommand& command, const Audit& audit, bool colour) {
    if (command.as == "json") {
        return dumped(audit_json(audit), 2) + '\n';
    }
    return command.as == "csv" ? audit_csv(audit) : audit_text(audit, colour);
}

void write_groups(const AuditCommand& command, const Audit& audit, const Streams& streams) {
    const std::string groups = groups_yaml(audit);
    if (groups.empty()) {
        streams.err << wrapped(
            "steelyard: no group gives reason to change its rho, so nothing was written to " +
                visible(command.write_groups),
            "", "  ");
        return;
    }
    write_whole(command.write_groups, groups);
}

}  // namespace

CLI::App* setup(CLI::App& app, AuditCommand& command) {
    CLI::App* audit = app.add_subcommand("audit", audit_description);
    audit->footer(audit_footer);
    audit
        ->add_option("files", command.files,
                     "Files of many cases, CSV or NDJSON, and tallies; - is standard input")
        ->required()
        ->type_name("FILE");
    audit
        ->add_option("--from", command.from,
                     "How the cases are written: csv or ndjson; auto tells it from the name, or from the "
                     "first line")
        ->capture_default_str()
        ->check(CLI::IsMember({"auto", "csv", "ndjson"}))
        ->type_name("FORM");
    audit
        ->add_option("--rejects", command.rejects,
                     "Write the rows that cannot be read to this CSV file: place, value and reason of each")
        ->type_name("FILE");
    audit->add_flag("--strict", command.strict, "Stop at the first row that cannot be read");
    audit->add_option("--priors", command.priors, "Prior set: the name of a shipped one, or a file")
        ->capture_default_str()
        ->type_name("SET");
    audit->add_option("--tables", command.tables, "Evidence tables: the name of a shipped set, or a folder")
        ->capture_default_str()
        ->type_name("SET");
    audit->add_option("--exclude", command.exclude, "Leave this cause out; may be given several times")
        ->type_name("CAUSE");
    audit
        ->add_option(
            "--by", command.by,
            "Also audit each value of this column apart; may be given several times. Tallies must have "
            "been kept by it")
        ->type_name("COLUMN");
    audit
        ->add_option(
            "--over", command.over,
            "Also show the score month by month, by the date in this column. Tallies must have kept the "
            "months")
        ->type_name("COLUMN");
    audit
        ->add_option("--against", command.against,
                     "Also compare with this prior set or these tables, patient by patient")
        ->type_name("SET");
    audit
        ->add_option("--cause", command.cause,
                     "Also tell whether acting on this cause's probability does good")
        ->type_name("CAUSE");
    audit
        ->add_option(
            "--threshold", command.thresholds,
            "The probability of it from which one would act, as 0.1; may be given several times. 0.05, "
            "0.1, 0.2, 0.3 and 0.5 when not given")
        ->type_name("P");
    audit->add_flag("--estimate-dependence", command.estimate_dependence,
                    "Also estimate how much findings of a group repeat each other, as a suggestion");
    audit
        ->add_option("--write-groups", command.write_groups,
                     "Write that suggestion to this file, as lines for set.yaml")
        ->type_name("FILE");
    audit->add_option("--level", command.level, "Of all intervals")
        ->capture_default_str()
        ->type_name("SHARE");
    audit->add_option("--replicates", command.replicates, "Resampled series for the intervals, 20 to 1000000")
        ->capture_default_str()
        ->type_name("N");
    audit->add_option("--seed", command.seed, "Seed of the resampling; the same seed gives the same audit")
        ->capture_default_str()
        ->type_name("N");
    audit->add_option("--bins", command.bins, "Of reliability curves, 2 to 100")
        ->capture_default_str()
        ->type_name("N");
    audit
        ->add_option(
            "--threads", command.threads,
            "Threads to work on, 1 to 256; all of the machine's when not given. No result depends on it")
        ->type_name("N");
    audit
        ->add_option("--keep-tally", command.keep_tally,
                     "Write all inputs added up to this file, to be audited or added up again")
        ->type_name("FILE");
    audit
        ->add_option(
            "--least-cell", command.least_cell,
            "Leave cells of fewer patients out of the tally that is kept, as 5; the audit itself is of all")
        ->type_name("N");
    audit->add_option("--as", command.as, "How to write the result: text, json or csv")
        ->capture_default_str()
        ->check(CLI::IsMember({"text", "json", "csv"}))
        ->type_name("FORM");
    audit->add_option("-o,--out", command.out, "Write the result to this file, whole or not at all")
        ->type_name("FILE");
    return audit;
}

int run(const AuditCommand& command, const Streams& streams) {
    AuditAsked asked = asked_for(command);
    std::uint64_t least_cell = 1;
    if (!command.least_cell.empty()) {
        if (command.keep_tally.empty()) {
            throw UsageError("--least-cell needs --keep-tally: it acts on the tally that is kept");
        }
        least_cell = number_in_option<std::uint64_t>("--least-cell", command.least_cell, 2, 1'000'000,
                                                     "a whole number from 2 to 1000000");
    }
    document::Diagnostics faults;
    const auto tables = open_tables(command.tables, faults);
    const auto all_priors =
        open_priors(command.priors, tables ? cause_ids(*tables) : std::vector<std::string>{}, faults);
    std::optional<TallyOfInputs> inputs;
    Against against;
    if (tables) {
        against = open_against(command, *tables, faults);
        if (all_priors) {
            check_composites(*tables, *all_priors, faults);
        }
        inputs = tally_of_inputs(
            command.files, *tables,
            {command.by, command.over, command.from, command.rejects, command.strict, asked.threads}, streams,
            faults);
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    const priors::PriorSet priors = without_excluded(*all_priors, *tables, command.exclude);
    if (against.priors) {
        against.priors = without_excluded(*against.priors, *tables, command.exclude);
    }
    if (!command.cause.empty() && priors.find(command.cause) == nullptr) {
        throw UsageError(fmt::format("--cause {}: not among the causes weighed{}", visible(command.cause),
                                     suggestion(command.cause, priors.ids())));
    }
    check_against(against, *tables, priors);
    const Tally& tally = inputs->tally;

    std::optional<Audit> audit;
    {
        Progress progress(streams.err, streams.terminal_err);
        asked.progress = [&](const std::string& what, double done) { progress.tell(what, done); };
        audit = audit_of(tally, *tables, priors, asked,
                         against.given() ? std::optional(against.pointers()) : std::nullopt);
    }
    if (!command.keep_tally.empty()) {
        save_tally(least_cell > 1 ? tally.suppressed(least_cell) : tally, command.keep_tally);
    }
    if (!command.write_groups.empty()) {
        write_groups(command, *audit, streams);
    }
    const bool to_file = !command.out.empty() && command.out != "-";
    write_result(command.out, written(command, *audit, streams.colour_out && !to_file), streams.out);
    if (inputs->set_aside > 0) {
        return rows_set_aside;
    }
    return audit->figures ? done : nothing_weighed;
}

}  // namespace steelyard::cli
