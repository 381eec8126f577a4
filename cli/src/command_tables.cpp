// SPDX-License-Identifier: Apache-2.0
// steelyard tables: look at evidence tables, and check them.
#include <fmt/format.h>

#include <ostream>

#include "open_inputs.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/likelihoods/evidence_markdown.hpp"
#include "tables_views.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::EvidenceTable;
using likelihoods::TableSet;

std::vector<const EvidenceTable*> chosen_tables(const TableSet& set,
                                                const std::vector<std::string>& findings) {
    std::vector<const EvidenceTable*> tables;
    std::vector<std::string> known;
    for (const EvidenceTable& table : set.tables) {
        known.push_back(table.finding);
        if (findings.empty()) {
            tables.push_back(&table);
        }
    }
    for (const std::string& finding : findings) {
        const EvidenceTable* table = set.find_table(finding);
        if (table == nullptr) {
            throw UsageError(fmt::format("--finding {}: the tables have no such finding{}", visible(finding),
                                         suggestion(finding, known)));
        }
        tables.push_back(table);
    }
    return tables;
}

void check_pair(const TableSet& set, const std::string& cause, const std::string& against) {
    if (cause.empty() != against.empty()) {
        throw UsageError("--cause and --against belong together: name both to see their ratios");
    }
    for (const std::string& id : {cause, against}) {
        if (!id.empty() && set.find_cause(id) == nullptr) {
            throw UsageError(
                fmt::format("the tables have no cause {}{}", visible(id), suggestion(id, cause_ids(set))));
        }
    }
    if (!cause.empty() && cause == against) {
        throw UsageError("--cause and --against name the same cause: every ratio would be 1");
    }
}

/// What a reader of the tables should know although it is no fault.
std::vector<std::string> remarks(const TableSet& set) {
    std::vector<std::string> list;
    for (const EvidenceTable& table : set.tables) {
        std::string raised;
        for (const likelihoods::EvidenceRow& row : table.rows) {
            if (row.least_acted) {
                raised += (raised.empty() ? "" : "; ") + set.title_of(row.cause);
            }
        }
        if (!raised.empty()) {
            list.push_back(
                fmt::format("{}: judged shares were raised to the least allowed, {} %, in the rows of: {}",
                            table.title, plain(100.0 * table.least), raised));
        }
        for (Eigen::Index band = 0; band < table.incoherence.size(); ++band) {
            list.push_back(fmt::format("{}, {}: the one-against-rest ratios miss coherence by {}",
                                       table.title, table.band_names[static_cast<std::size_t>(band)],
                                       plain(table.incoherence(band), 2)));
        }
    }
    return list;
}

std::string check_text(const TableSet& set, const std::vector<std::string>& notes) {
    std::size_t rows = 0;
    for (const EvidenceTable& table : set.tables) {
        rows += table.rows.size();
    }
    std::string text =
        wrapped(fmt::format("{} ({}): sound. {} causes, {} findings, {} rows, {} groups, {} urgent limits.",
                            visible(set.title), visible(set.name), set.causes.size(), set.tables.size(), rows,
                            set.groups.size(), set.urgent.size()),
                "", "  ");
    text += fmt::format("  {}\n", set.digest);
    for (const std::string& note : notes) {
        text += wrapped(visible(note), "  - ", "    ");
    }
    return text;
}

}  // namespace

CLI::App* setup(CLI::App& app, TablesCommand& command) {
    CLI::App* tables = app.add_subcommand("tables", "Look at evidence tables, and check them");
    tables->require_subcommand(1);

    CLI::App* show = tables->add_subcommand("show",
                                            "Show evidence tables: the chance of each band under each cause, "
                                            "or the ratio of any cause against any other "
                                            "with its 95 % interval; always with what each row rests on");
    show->add_option("SET", command.show.tables, "A shipped set by name, or a folder")->capture_default_str();
    show->add_option("-f,--finding", command.show.findings, "Only this finding. May be repeated")
        ->type_name("FINDING")
        ->expected(1)
        ->take_all();
    show->add_option("--cause", command.show.cause, "Show ratios for this cause; needs --against")
        ->type_name("CAUSE");
    show->add_option("--against", command.show.against, "The cause the ratios are against")
        ->type_name("CAUSE");
    show->add_option("--as", command.show.as, "How to write it: text, json or markdown")
        ->capture_default_str()
        ->check(CLI::IsMember({"text", "json", "markdown"}))
        ->type_name("FORM");
    show->add_option("-o,--out", command.show.out, "Write to this file, whole or not at all")
        ->type_name("FILE");
    show->footer(
        "Examples:\n  steelyard tables show --finding urine_anion_gap\n"
        "  steelyard tables show --cause classic_distal --against extrarenal\n"
        "  steelyard tables show our-tables/ --as markdown\n\nExit codes: 0 done, 2 wrong command line, 3 "
        "the set is invalid.");

    CLI::App* check = tables->add_subcommand(
        "check", "Check table sets: every fault is listed as file:line:column with what to do about it");
    check->add_option("SET", command.check.tables,
                      "Shipped sets by name, or folders; the shipped set `adult` when none is named");
    check->add_option("--as", command.check.as, "How to write it: text or json")
        ->capture_default_str()
        ->check(CLI::IsMember({"text", "json"}))
        ->type_name("FORM");
    check->footer("Exit codes: 0 all sound, 2 wrong command line, 3 a set has faults.");
    return tables;
}

int run(const TablesShowCommand& command, const Streams& streams) {
    const TableSet set = likelihoods::open_table_set(command.tables);
    check_pair(set, command.cause, command.against);
    const std::vector<const EvidenceTable*> tables = chosen_tables(set, command.findings);
    std::string text;
    if (command.as == "json") {
        nlohmann::ordered_json json = tables_json(set, tables, command.cause, command.against);
        json["caution"] = caution_text;
        text = dumped(json, 2) + "\n";
    } else if (command.as == "markdown") {
        if (!command.cause.empty() || !command.findings.empty()) {
            throw UsageError(
                "--as markdown writes the whole set; ask for single findings or ratios as text or json");
        }
        text = likelihoods::evidence_markdown(set);
    } else {
        text = tables_text(set, tables, command.cause, command.against,
                           streams.colour_out && command.out.empty());
        text += "\n" + wrapped(std::string("Caution: ") + caution_text, "", "  ");
    }
    write_result(command.out, text, streams.out);
    return done;
}

int run(const TablesCheckCommand& command, const Streams& streams) {
    document::Diagnostics faults;
    std::string text;
    nlohmann::ordered_json all = nlohmann::ordered_json::array();
    const std::vector<std::string> names =
        command.tables.empty() ? std::vector<std::string>{"adult"} : command.tables;
    for (const std::string& name : names) {
        const std::size_t before = faults.size();
        if (const auto set = open_tables(name, faults)) {
            const std::vector<std::string> notes = remarks(*set);
            text += check_text(*set, notes);
            all.push_back({{"name", set->name},
                           {"title", set->title},
                           {"digest", set->digest},
                           {"sound", true},
                           {"remarks", notes}});
        } else {
            all.push_back({{"name", name}, {"sound", false}, {"faults", faults.size() - before}});
        }
    }
    // Sound sets are reported although another has faults: checking several at once is for finding out which.
    streams.out << (command.as == "json" ? dumped(all, 2) + "\n" : text);
    if (!faults.empty()) {
        document::print(streams.err, faults, streams.colour_err);
        streams.err << fmt::format("steelyard: {} fault{} found\n", faults.size(),
                                   faults.size() == 1 ? "" : "s");
        return invalid_input;
    }
    return done;
}

}  // namespace steelyard::cli
