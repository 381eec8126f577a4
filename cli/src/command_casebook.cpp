// SPDX-License-Identifier: Apache-2.0
// steelyard casebook: the clinic's register of weighed cases and their final causes.
#include <fmt/format.h>

#include <algorithm>
#include <ostream>

#include "casebook_file.hpp"
#include "casebook_views.hpp"
#include "exclude.hpp"
#include "open_inputs.hpp"
#include "outcome_lines.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/read_cases.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/document/strict_map.hpp"
#include "steelyard/likelihoods/pattern_code.hpp"
#include "utc_time.hpp"

namespace steelyard::cli {
namespace {

constexpr const char* casebook_description =
    "Keep a clinic's register in one file: what was said of each case at the time, and the final cause found "
    "later.";

constexpr const char* casebook_footer =
    R"(A casebook is data of patients, also with hashed ids: keep it as such. It is an
SQLite file with a log beside it while it is in use; keep both on a local disk,
not on a network share, and copy it only while nothing writes to it.)";

constexpr const char* record_footer =
    R"(A case is kept as its id, the time, the bands of its findings, the gate, prior
and posterior of each cause, and what tables and priors these came from. No
value, name or date of birth is kept. A final cause that stands in the case file
is not taken over: enter it with `casebook outcome`.

A case out of scope is recorded as such, without a posterior, so that the book
also shows what was not weighed; --weigh-anyway gives it one.

--salted keeps the SHA-256 of a random salt and the id in place of each id. This
hides ids from onlookers. It does not hide them from whoever holds the file, who
has the salt and can try ids one after the other; with --salt-file the salt is
kept in a file apart, and only who has both can.

A case may be recorded once. With --again a later recording is kept beside the
first. Audits use the first one that was weighed before a final cause was
entered, since a case weighed again knows more.

Examples:
  steelyard casebook record case.yaml --casebook ward.casebook
  steelyard casebook record *.yaml -b ward.casebook --priors general-ward
  steelyard casebook record case.yaml --casebook new.casebook --salted

Exit codes:
  0  every case was recorded, and at least one was weighed
  2  the command line is wrong, or the casebook cannot be written
  3  an input is invalid, or a case is recorded already: nothing was recorded
  4  the cases were recorded, but none was weighed: all were out of scope
 70  an unexpected failure of the program itself)";

constexpr const char* outcome_footer =
    R"(CAUSE is one of the causes of the tables with which the case was recorded. A
cause outside them is a word of your own (lower-case letters, digits and _) and
needs --outside, so that a slip of the pen is not taken for one.

A final cause is never overwritten. --amend adds a new one, which then holds,
with the reason; the old one stays in the book.

--from reads a CSV file with the columns case and final_cause. Either all of its
lines are entered or none. A line that repeats what is in the book is passed
over. In a file a word that is nearly one of the causes is refused even with
--outside: enter it by itself.

Examples:
  steelyard casebook outcome larkmoor-017 classic_distal -b ward.casebook
  steelyard casebook outcome larkmoor-018 toluene --outside -b ward.casebook
  steelyard casebook outcome larkmoor-017 extrarenal --amend \
      --why "ileostomy found" --casebook ward.casebook
  steelyard casebook outcome --from outcomes.csv --casebook ward.casebook

Exit codes:
  0  done
  2  the command line is wrong, or the casebook cannot be written
  3  an input is invalid: every fault is listed, and nothing was entered
 70  an unexpected failure of the program itself)";

constexpr const char* list_footer = R"(Examples:
  steelyard casebook list --casebook ward.casebook
  steelyard casebook list larkmoor-017 --casebook ward.casebook
  steelyard casebook list --all --as csv --casebook ward.casebook

Exit codes: 0 done, 2 wrong command line, 3 the casebook cannot be read.)";

constexpr const char* export_footer =
    R"(One line for each case: the recording that stands for it in audits, posterior
and prior of each cause in full precision, pattern, digests, final cause.

Examples:
  steelyard casebook export --casebook ward.casebook --out ward.csv
  steelyard casebook export --as ndjson --casebook ward.casebook

Exit codes: 0 done, 2 wrong command line, 3 the casebook cannot be read.)";

std::string counted(std::size_t count, std::string_view word) {
    return fmt::format("{} {}{}", count, word, count == 1 ? "" : "s");
}

std::string holds(const CasebookWriter::Counts& counts) {
    return fmt::format("It holds {}, {} without a final cause.",
                       counted(static_cast<std::size_t>(counts.cases), "case"), counts.open);
}

Recording recording_of(const likelihoods::TableSet& tables, const Weighing& weighing) {
    Recording recording{
        weighing.panel.case_id,
        std::string(likelihoods::to_string(weighing.gate.status)),
        likelihoods::code_in_characters(tables, likelihoods::code_of(tables, weighing.pattern)),
        {}};
    for (const WeighedCause& cause : weighing.causes) {
        recording.causes.push_back({cause.id, cause.prior, cause.posterior});
    }
    return recording;
}

/// Refuses cases that are in the book already. @throws document::LoadError
void check_new(CasebookWriter& book, const std::vector<Weighing>& cases, bool again, const Streams& streams) {
    document::Diagnostics faults;
    for (const Weighing& one : cases) {
        const auto known = book.known(one.panel.case_id);
        if (known.recordings > 0 && !again) {
            faults.add(one.panel.where, document::Code::conflicting_values,
                       fmt::format("the case {} is recorded already", visible(one.panel.case_id)),
                       "--again keeps a second recording beside the first");
        } else if (known.final_cause) {
            streams.err << wrapped(
                fmt::format("steelyard: {} has its final cause already; audits use what was recorded "
                            "before it was entered",
                            visible(one.panel.case_id)),
                "", "  ");
        }
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
}

/// What is wrong with a final cause; empty when it may be entered.
struct Refusal {
    document::Code code{};
    bool at_case = false;  ///< the fault is the case's, not the cause's
    std::string message, hint;
};

enum class Entry { added, there_already };

/// Enters one final cause, or says why not.
std::optional<Refusal> enter(CasebookWriter& book, const CasebookOutcomeCommand& command,
                             const std::string& case_id, const std::string& cause, bool from_file,
                             Entry& entry) {
    const auto known = book.known(case_id);
    if (known.recordings == 0) {
        std::string near;
        if (!book.ids_are_hashed()) {
            near = document::nearest(case_id, book.case_ids());
        }
        return Refusal{document::Code::bad_choice, true,
                       fmt::format("the casebook holds no case {}{}", visible(case_id),
                                   near.empty() ? "" : "; did you mean " + visible(near) + "?"),
                       "record the case first"};
    }
    const bool inside = std::find(known.causes.begin(), known.causes.end(), cause) != known.causes.end();
    const bool near = !document::nearest(cause, known.causes).empty();
    if (!document::is_identifier(cause) || cause.size() > 64) {
        return Refusal{document::Code::bad_identifier, false,
                       fmt::format("{} cannot be the name of a cause{}", visible(cause),
                                   near ? suggestion(cause, known.causes) : ""),
                       "names have lower-case letters, digits and _, begin with a letter, and have at most "
                       "64 characters"};
    }
    if (!inside && (!command.outside || (near && from_file))) {
        return Refusal{
            document::Code::unknown_cause, false,
            fmt::format("{} is none of the tables' causes{}", cause, suggestion(cause, known.causes)),
            from_file && near ? "correct the word; if it is meant, enter it by itself with --outside"
                              : "--outside enters a cause of another kind"};
    }
    if (known.final_cause == cause) {
        entry = Entry::there_already;
        return std::nullopt;
    }
    if (known.final_cause && !command.amend) {
        return Refusal{
            document::Code::conflicting_values, false,
            fmt::format("{} has the final cause {} already", visible(case_id), visible(*known.final_cause)),
            "--amend --why REASON adds another, which then holds"};
    }
    if (!known.final_cause && command.amend) {
        return Refusal{document::Code::conflicting_values, false,
                       fmt::format("{} has no final cause that could be amended", visible(case_id)),
                       "leave out --amend"};
    }
    book.add_outcome(case_id, cause, !inside, command.why);
    entry = Entry::added;
    return std::nullopt;
}

/// Checks that the words of `outcome` go together. @throws UsageError
void check_words(const CasebookOutcomeCommand& command) {
    const bool one = !command.case_id.empty() || !command.cause.empty();
    if (one == !command.from.empty()) {
        throw UsageError(one ? "give CASE and CAUSE, or --from FILE, not both"
                             : "give CASE and CAUSE, or --from FILE");
    }
    if (one && command.cause.empty()) {
        throw UsageError("give the CAUSE after the CASE");
    }
    if (command.amend && command.why.find_first_not_of(' ') == std::string::npos) {
        throw UsageError("--amend needs --why REASON: the book keeps why a final cause was changed");
    }
    if (!command.amend && !command.why.empty()) {
        throw UsageError("--why goes with --amend");
    }
    if (command.why.size() > 500) {
        throw UsageError("--why: at most 500 characters");
    }
}

std::chrono::milliseconds patience(int seconds) {
    return std::chrono::seconds(seconds);
}

void add_casebook_options(CLI::App* command, std::string& casebook, int& wait) {
    command->add_option("-b,--casebook", casebook, "The casebook's file")
        ->required()
        ->type_name("FILE")
        ->check([](const std::string& text) {
            return text.empty() ? std::string("names no file") : std::string();
        });
    command
        ->add_option("--wait", wait, "How many seconds to wait while another program writes to the casebook")
        ->capture_default_str()
        ->check(CLI::Range(0, 3600))
        ->type_name("SECONDS");
}

void add_salt_option(CLI::App* command, std::string& salt_file, const char* description) {
    command->add_option("--salt-file", salt_file, description)->type_name("FILE");
}

void set_up_record(CLI::App& casebook, CasebookRecordCommand& command) {
    CLI::App* record = casebook.add_subcommand(
        "record", "Weigh cases and keep what was said of them; starts the casebook when there is none");
    record->footer(record_footer);
    record->add_option("CASES", command.cases, "Case files, YAML or JSON; - reads standard input")
        ->required()
        ->type_name("FILE");
    add_casebook_options(record, command.casebook, command.wait);
    record->add_option("-p,--priors", command.priors, "Prior set: the name of a shipped set, or a file")
        ->capture_default_str()
        ->type_name("SET");
    record
        ->add_option("-t,--tables", command.tables, "Evidence tables: the name of a shipped set, or a folder")
        ->capture_default_str()
        ->type_name("SET");
    record
        ->add_option("-x,--exclude", command.exclude,
                     "Leave a cause out; the others keep their proportions. May be repeated")
        ->type_name("CAUSE")
        ->expected(1)
        ->take_all();
    record->add_flag("--weigh-anyway", command.weigh_anyway,
                     "Weigh a case that is out of scope; its gate says so in the book");
    record->add_flag("--again", command.again,
                     "Keep another recording of a case that is in the book already");
    record->add_flag("--salted", command.salted, "Start the casebook with hashed ids, see below");
    add_salt_option(record, command.salt_file,
                    "Keep the salt in this file, apart from the casebook; it is made when it is not there");
}

void set_up_outcome(CLI::App& casebook, CasebookOutcomeCommand& command) {
    CLI::App* outcome = casebook.add_subcommand("outcome", "Enter the final cause of a case, or amend it");
    outcome->footer(outcome_footer);
    outcome->add_option("CASE", command.case_id, "The case, as it was recorded")->type_name("ID");
    outcome->add_option("CAUSE", command.cause, "Its final cause")->type_name("WORD");
    add_casebook_options(outcome, command.casebook, command.wait);
    outcome
        ->add_option("--from", command.from, "Enter all final causes of a CSV file; - reads standard input")
        ->type_name("FILE");
    outcome->add_flag("--outside", command.outside, "The cause is none of the tables', and is meant");
    outcome->add_flag("--amend", command.amend,
                      "Put another final cause in place of the one entered, which stays");
    outcome->add_option("--why", command.why, "Why it is amended, without personal data")
        ->type_name("REASON");
    add_salt_option(outcome, command.salt_file, "Where the salt is kept, if apart from the casebook");
}

void set_up_list(CLI::App& casebook, CasebookListCommand& command) {
    CLI::App* list = casebook.add_subcommand("list", "List the cases that have no final cause yet, or all");
    list->footer(list_footer);
    list->add_option("CASES", command.cases, "Only these cases, whether open or not")->type_name("ID");
    add_casebook_options(list, command.casebook, command.wait);
    CLI::Option* open =
        list->add_flag("--open", command.open, "Only cases without a final cause (the default)");
    list->add_flag("--all", command.all, "All cases")->excludes(open);
    list->add_option("--as", command.as, "How to write it: text, csv or json")
        ->capture_default_str()
        ->check(CLI::IsMember({"text", "csv", "json"}))
        ->type_name("FORM");
    list->add_option("-o,--out", command.out, "Write to this file, whole or not at all")->type_name("FILE");
    add_salt_option(list, command.salt_file, "Where the salt is kept, to find CASES by their plain ids");
}

void set_up_export(CLI::App& casebook, CasebookExportCommand& command) {
    CLI::App* all = casebook.add_subcommand("export", "Write the casebook as a table for other programs");
    all->footer(export_footer);
    add_casebook_options(all, command.casebook, command.wait);
    all->add_flag("--all-recordings", command.all_recordings,
                  "One line for each recording, also of cases recorded again; `counts` tells which stands "
                  "for its case");
    all->add_option("--as", command.as, "How to write it: csv or ndjson")
        ->capture_default_str()
        ->check(CLI::IsMember({"csv", "ndjson"}))
        ->type_name("FORM");
    all->add_option("-o,--out", command.out, "Write to this file, whole or not at all")->type_name("FILE");
}

}  // namespace

CLI::App* setup(CLI::App& app, CasebookCommand& command) {
    CLI::App* casebook = app.add_subcommand("casebook", casebook_description);
    casebook->require_subcommand(1);
    casebook->footer(casebook_footer);
    set_up_record(*casebook, command.record);
    set_up_outcome(*casebook, command.outcome);
    set_up_list(*casebook, command.list);
    set_up_export(*casebook, command.write);
    return casebook;
}

int run(const CasebookRecordCommand& command, const Streams& streams) {
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
    const CasebookSource source = {provenance.version,       provenance.tables_title,
                                   provenance.tables_digest, likelihoods::reading_digest(*tables),
                                   provenance.priors_title,  provenance.priors_digest,
                                   cause_ids(*tables)};
    std::vector<Weighing> cases;
    std::size_t weighed = 0;
    for (likelihoods::Panel& panel : panels) {
        cases.push_back(
            weigh_case(*tables, priors, std::move(panel), {command.weigh_anyway, command.exclude}));
        weighed += cases.back().weighed ? 1U : 0U;
    }

    // The weighing is done before the casebook is locked, so that others wait for the writing alone.
    CasebookWriter book({command.casebook, patience(command.wait), true, command.salted, command.salt_file});
    check_new(book, cases, command.again, streams);
    for (const Weighing& one : cases) {
        book.record(source, recording_of(*tables, one));
    }
    const CasebookWriter::Counts counts = book.counts();
    book.commit();

    std::string text = wrapped(
        fmt::format("{} {} {}. {}", book.was_started() ? "Started" : "Added to", visible(command.casebook),
                    book.was_started() ? fmt::format("with {}", counted(cases.size(), "case"))
                                       : counted(cases.size(), "case"),
                    holds(counts)),
        "", "  ");
    for (const Weighing& one : cases) {
        std::string said = "recorded without a posterior, it is out of scope";
        if (one.weighed) {
            const WeighedCause& leader = one.causes[one.ranking[0]];
            said = fmt::format("{} leads with {} (prior {})", leader.title, percent(leader.posterior),
                               percent(leader.prior));
        }
        text += wrapped(fmt::format("{}: {}", visible(one.panel.case_id), visible(said)), "  ", "    ");
        if (one.panel.final_cause) {
            streams.err << wrapped(
                fmt::format(
                    "steelyard: {} states a final cause, which was not taken over; enter it with `steelyard "
                    "casebook outcome`",
                    visible(one.panel.case_id)),
                "", "  ");
        }
    }
    streams.out << text << wrapped(std::string("Caution: ") + caution_text, "", "  ");
    return weighed == 0 ? nothing_weighed : done;
}

int run(const CasebookOutcomeCommand& command, const Streams& streams) {
    check_words(command);
    document::Diagnostics faults;
    std::vector<OutcomeLine> lines = {{command.case_id, command.cause, {}, {}}};
    const bool from_file = !command.from.empty();
    if (from_file) {
        const auto text = document::read_text(command.from, faults);
        lines = text ? read_outcome_lines(*text, command.from, faults) : std::vector<OutcomeLine>{};
        if (!text) {
            throw document::LoadError(faults);
        }
    }
    CasebookWriter book({command.casebook, patience(command.wait), false, false, command.salt_file});
    std::size_t added = 0;
    std::size_t there = 0;
    for (const OutcomeLine& line : lines) {
        Entry entry{};
        if (const auto refusal = enter(book, command, line.case_id, line.final_cause, from_file, entry)) {
            if (!from_file) {
                throw UsageError(fmt::format("{}; {}", refusal->message, refusal->hint));
            }
            faults.add(refusal->at_case ? line.case_at : line.cause_at, refusal->code, refusal->message,
                       refusal->hint);
        } else {
            (entry == Entry::added ? added : there) += 1;
        }
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    const CasebookWriter::Counts counts = book.counts();
    book.commit();
    std::string text =
        fmt::format("Entered {} in {}.", counted(added, "final cause"), visible(command.casebook));
    if (there > 0) {
        text += fmt::format(" {} {} there already.", there, there == 1 ? "was" : "were");
    }
    streams.out << wrapped(text + " " + holds(counts), "", "  ")
                << wrapped(std::string("Caution: ") + caution_text, "", "  ");
    return done;
}

int run(const CasebookListCommand& command, const Streams& streams) {
    const std::vector<CasebookEntry> all = read_casebook(command.casebook, patience(command.wait));
    std::vector<CasebookEntry> shown;
    if (command.cases.empty()) {
        std::copy_if(all.begin(), all.end(), std::back_inserter(shown),
                     [&](const CasebookEntry& entry) { return command.all || entry.outcome() == nullptr; });
    } else {
        const auto ids = kept_ids(command.casebook, command.salt_file, command.cases, patience(command.wait));
        for (std::size_t i = 0; i < ids.size(); ++i) {
            const auto found = std::find_if(
                all.begin(), all.end(), [&](const CasebookEntry& entry) { return entry.case_id == ids[i]; });
            if (found == all.end()) {
                throw UsageError(fmt::format("the casebook holds no case {}", visible(command.cases[i])));
            }
            shown.push_back(*found);
        }
    }
    const bool to_file = !command.out.empty() && command.out != "-";
    const std::string now = utc_now();
    std::string text;
    if (command.as == "csv") {
        text = casebook_list_csv(shown, now);
    } else if (command.as == "json") {
        text = casebook_list_json(shown, now);
    } else {
        text = casebook_list_text(command.casebook, shown, all, !command.all && command.cases.empty(), now,
                                  streams.colour_out && !to_file);
    }
    write_result(command.out, text, streams.out);
    return done;
}

int run(const CasebookExportCommand& command, const Streams& streams) {
    const auto entries = command.all_recordings ? read_recordings(command.casebook, patience(command.wait))
                                                : read_casebook(command.casebook, patience(command.wait));
    write_result(command.out, command.as == "csv" ? casebook_csv(entries) : casebook_ndjson(entries),
                 streams.out);
    return done;
}

}  // namespace steelyard::cli
