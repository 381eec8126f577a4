// SPDX-License-Identifier: Apache-2.0
// steelyard simulate: made-up cases, drawn from tables and priors.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <optional>
#include <ostream>
#include <thread>

#include "exclude.hpp"
#include "open_inputs.hpp"
#include "progress.hpp"
#include "simulation.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/engine/parallel.hpp"

namespace steelyard::cli {
namespace {

constexpr const char* simulate_description =
    "Make up cases by drawing from tables and priors: a final cause by its prior, the band of each finding "
    "by the "
    "cause's row, and a panel of values that reads into these bands. For trying the program, for teaching, "
    "and to "
    "check that weighing is calibrated. No case is a patient.";

constexpr const char* simulate_footer =
    R"(Cases are drawn by the prior set of --priors. Weighed with the same set and
tables they come out calibrated, but for findings that share their weight in a
group: the tables hold them to be related, and here they are drawn apart, so
that their posteriors are less sure than they could be. Weighed with another set
they show what a wrong prior does:

  steelyard simulate -n 5000 --priors general-ward --out ward.csv
  steelyard weigh ward.csv --priors renal-clinic

A finding that a condition of use keeps from being read is left out; so are
others, with the chance --missing. Of findings that are alternatives of each
other the preferred one is drawn, with --alternatives any one of them. What the
gate asks for and a case does not show is stated as a limit: bicarbonate <22.

A derived quantity stands in its own column where no set of measured values
gives all bands at once. YAML files are for up to some thousand cases.

Exit codes:
  0  done
  2  the command line is wrong, or the result could not be written
  3  tables or priors are invalid
 70  an unexpected failure of the program itself)";

/// What became of the cases, for the line on standard error.
struct Counts {
    std::array<std::uint64_t, 3> by_gate{};
    std::uint64_t with_derived = 0;

    void add(const likelihoods::MadePanel& made) {
        ++by_gate[static_cast<std::size_t>(made.gate)];
        const bool stated = std::any_of(made.panel.given.begin(), made.panel.given.end(),
                                        [](const auto& entry) { return entry.second.value.is_point(); });
        with_derived += stated ? 1U : 0U;
    }
    void add(const Counts& other) {
        for (std::size_t i = 0; i < by_gate.size(); ++i) {
            by_gate[i] += other.by_gate[i];
        }
        with_derived += other.with_derived;
    }
};

/// The option parser would take -1 for the largest seed. @throws UsageError
std::uint64_t seed_of(const std::string& text) {
    std::uint64_t seed = 0;
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), seed);
    if (error != std::errc() || end != text.data() + text.size()) {
        throw UsageError(fmt::format("--seed {}: must be a whole number from 0 to 2^64 - 1", visible(text)));
    }
    return seed;
}

using AddCase = void (*)(const likelihoods::Panel&, const std::vector<likelihoods::PanelEntry>&,
                         std::string&);

AddCase writer_of(const std::string& form) {
    if (form == "csv") {
        return add_simulated_csv;
    }
    return form == "yaml" ? add_simulated_yaml : add_simulated_ndjson;
}

std::string heading(const SimulateCommand& command, const Simulation& simulation,
                    const Provenance& provenance) {
    if (command.as == "csv") {
        return simulated_csv_header(simulation.maker().entries());
    }
    if (command.as == "yaml") {
        return fmt::format(
            "# Made-up cases, no patients: steelyard {}, seed {}.\n# Drawn by the prior set {} ({})\n"
            "# from the tables {} ({}).\n",
            provenance.version, command.seed, visible(provenance.priors_title), provenance.priors_digest,
            visible(provenance.tables_title), provenance.tables_digest);
    }
    return "";
}

/// Makes cases a few thousand at a time, in parallel, and writes them in order.
Counts write_cases(const SimulateCommand& command, const likelihoods::TableSet& tables,
                   const Simulation& simulation, ResultWriter& writer, const Streams& streams) {
    constexpr std::uint64_t cases_of_job = 512;
    const int threads = command.threads > 0
                            ? command.threads
                            : static_cast<int>(std::clamp(std::thread::hardware_concurrency(), 1U, 256U));
    const std::uint64_t jobs_at_once = 8 * static_cast<std::uint64_t>(threads);
    const AddCase add = writer_of(command.as);
    const auto& entries = simulation.maker().entries();
    Progress progress(streams.err, streams.terminal_err);
    Counts counts;
    for (std::uint64_t begin = 0; begin < command.cases && writer.wanted();
         begin += jobs_at_once * cases_of_job) {
        const std::uint64_t left = command.cases - begin;
        const std::uint64_t jobs = std::min(jobs_at_once, (left + cases_of_job - 1) / cases_of_job);
        std::vector<std::string> texts(jobs);
        std::vector<Counts> counts_of_job(jobs);
        engine::run_in_parallel(static_cast<Eigen::Index>(jobs), threads, [&](Eigen::Index job) {
            const auto j = static_cast<std::size_t>(job);
            std::optional<likelihoods::PointReader> reader;
            if (likelihoods::PointReader::can_read(tables)) {
                reader.emplace(tables);
            }
            const std::uint64_t first = begin + j * cases_of_job;
            for (std::uint64_t i = first; i < std::min(first + cases_of_job, command.cases); ++i) {
                const likelihoods::MadePanel made = simulation.one(i, reader ? &*reader : nullptr);
                counts_of_job[j].add(made);
                add(made.panel, entries, texts[j]);
            }
        });
        for (std::size_t j = 0; j < jobs; ++j) {
            writer.write(texts[j]);
            counts.add(counts_of_job[j]);
        }
        progress.tell(fmt::format("{} cases", command.cases),
                      static_cast<double>(begin) / static_cast<double>(command.cases));
    }
    return counts;
}

}  // namespace

CLI::App* setup(CLI::App& app, SimulateCommand& command) {
    CLI::App* simulate = app.add_subcommand("simulate", simulate_description);
    simulate->footer(simulate_footer);
    simulate->add_option("-n,--cases", command.cases, "How many cases")
        ->capture_default_str()
        ->check(CLI::Range(std::uint64_t{1}, std::uint64_t{1'000'000'000}).description(""))
        ->type_name("N");
    simulate
        ->add_option("-p,--priors", command.priors,
                     "Prior set by which causes are drawn: a shipped set, or a file")
        ->capture_default_str()
        ->type_name("SET");
    simulate
        ->add_option("-t,--tables", command.tables, "Evidence tables: the name of a shipped set, or a folder")
        ->capture_default_str()
        ->type_name("SET");
    simulate
        ->add_option("-x,--exclude", command.exclude,
                     "Leave a cause out; the others keep their proportions. May be repeated")
        ->type_name("CAUSE")
        ->expected(1)
        ->take_all();
    simulate
        ->add_option("-f,--findings", command.findings, "Draw only these findings, with commas between them")
        ->delimiter(',')
        ->type_name("LIST");
    simulate
        ->add_option("--missing", command.missing,
                     "Leave each finding out with this chance, from 0 to 1, as 0.3")
        ->capture_default_str()
        ->check(CLI::Range(0.0, 1.0).description(""))
        ->type_name("SHARE");
    simulate->add_flag("--alternatives", command.alternatives,
                       "Of alternatives draw any one, each as likely, instead of the preferred one");
    simulate->add_option("--seed", command.seed, "Seed of the draws; the same seed gives the same cases")
        ->capture_default_str()
        ->type_name("N");
    simulate
        ->add_option(
            "--threads", command.threads,
            "Threads to draw on, 1 to 256; all of the machine's when not given. No result depends on it")
        ->check(CLI::Range(1, 256).description(""))
        ->type_name("N");
    simulate->add_option("--as", command.as, "How to write the cases: csv, yaml or ndjson")
        ->capture_default_str()
        ->check(CLI::IsMember({"csv", "yaml", "ndjson"}))
        ->type_name("FORM");
    simulate->add_option("-o,--out", command.out, "Write to this file, whole or not at all")
        ->type_name("FILE");
    return simulate;
}

int run(const SimulateCommand& command, const Streams& streams) {
    document::Diagnostics faults;
    const auto tables = open_tables(command.tables, faults);
    const auto all_priors =
        open_priors(command.priors, tables ? cause_ids(*tables) : std::vector<std::string>{}, faults);
    if (tables && all_priors) {
        check_composites(*tables, *all_priors, faults);
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    const priors::PriorSet priors = without_excluded(*all_priors, *tables, command.exclude);
    const Provenance provenance = provenance_of(*tables, priors);
    const Simulation simulation(
        *tables, priors, {seed_of(command.seed), command.missing, command.findings, command.alternatives});
    for (const std::string& finding : simulation.maker().never_shown()) {
        streams.err << wrapped(
            fmt::format("steelyard: {} is in no case: its conditions of use contradict those of "
                        "other findings",
                        visible(finding)),
            "", "  ");
    }
    ResultWriter writer(command.out, streams.out);
    writer.write(heading(command, simulation, provenance));
    const Counts counts = write_cases(command, *tables, simulation, writer, streams);
    writer.finish();
    streams.err << wrapped(
        fmt::format("steelyard: {} made-up case{}, no patients, drawn by the prior set {} ({}) from the "
                    "tables {} ({}), "
                    "seed {}: {} in scope, {} with caution, {} out of scope; in {} a derived quantity is "
                    "stated itself",
                    command.cases, command.cases == 1 ? "" : "s", visible(provenance.priors_title),
                    provenance.priors_digest.substr(0, 23), visible(provenance.tables_title),
                    provenance.tables_digest.substr(0, 23), command.seed, counts.by_gate[0],
                    counts.by_gate[1], counts.by_gate[2], counts.with_derived),
        "", "  ");
    return done;
}

}  // namespace steelyard::cli
