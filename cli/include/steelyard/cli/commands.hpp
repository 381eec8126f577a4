// SPDX-License-Identifier: Apache-2.0
#pragma once
// The commands. Each has a plain options struct, a setup that ties it to the command line, and a run that
// takes streams, so that most tests need no process.

#include <CLI/CLI.hpp>
#include <cstdint>
#include <iosfwd>
#include <optional>
#include <string>
#include <vector>

#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {

/// Exit codes of the program.
enum ExitCode : int {
    done = 0,
    usage = 2,          ///< the command line is wrong
    invalid_input = 3,  ///< an input is invalid
    nothing_weighed = 4,
    rows_set_aside = 5,
    failure = 70  ///< an unexpected failure of the program itself
};

/// Where a command writes.
struct Streams {
    std::ostream& out;
    std::ostream& err;
    bool colour_out = false;
    bool colour_err = false;
    bool terminal_err = false;  ///< progress may be shown
};

struct WeighCommand {
    std::vector<std::string> cases;
    std::string priors = "renal-clinic";
    std::string tables = "adult";
    std::vector<std::string> exclude;
    bool weigh_anyway = false;
    bool brief = false;
    bool full = false;
    std::string burden = "specialised";
    std::string until, epsilon, draws, threads;  ///< as typed; empty when not given
    std::string seed = "1";
    std::string from = "auto";
    std::string as;  ///< empty: text for documents, csv for files of rows
    std::string out;
    std::string rejects;
    bool strict = false;
    std::vector<std::string> carry;
};
CLI::App* setup(CLI::App& app, WeighCommand& command);
int run(const WeighCommand& command, const Streams& streams);

struct TablesShowCommand {
    std::string tables = "adult";
    std::vector<std::string> findings;
    std::string cause;
    std::string against;
    std::string as = "text";
    std::string out;
};
struct TablesCheckCommand {
    std::vector<std::string> tables;
    std::string as = "text";
};
struct TablesCommand {
    TablesShowCommand show;
    TablesCheckCommand check;
};
CLI::App* setup(CLI::App& app, TablesCommand& command);
int run(const TablesShowCommand& command, const Streams& streams);
int run(const TablesCheckCommand& command, const Streams& streams);

struct PriorsShowCommand {
    std::string priors = "renal-clinic";
    std::string tables = "adult";
    std::string as = "text";
    std::string out;
};
struct PriorsCommand {
    PriorsShowCommand show;
};
CLI::App* setup(CLI::App& app, PriorsCommand& command);
int run(const PriorsShowCommand& command, const Streams& streams);

struct CasebookRecordCommand {
    std::vector<std::string> cases;
    std::string casebook;
    std::string priors = "renal-clinic";
    std::string tables = "adult";
    std::vector<std::string> exclude;
    bool weigh_anyway = false;
    bool again = false;
    bool salted = false;
    std::string salt_file;
    int wait = 30;  ///< [s]
};
struct CasebookOutcomeCommand {
    std::string case_id, cause;
    std::string casebook;
    std::string from;
    bool outside = false;
    bool amend = false;
    std::string why;
    std::string salt_file;
    int wait = 30;
};
struct CasebookListCommand {
    std::vector<std::string> cases;
    std::string casebook;
    bool open = false;
    bool all = false;
    std::string as = "text";
    std::string out;
    std::string salt_file;
    int wait = 30;
};
struct CasebookExportCommand {
    std::string casebook;
    bool all_recordings = false;
    std::string as = "csv";
    std::string out;
    int wait = 30;
};
struct CasebookCommand {
    CasebookRecordCommand record;
    CasebookOutcomeCommand outcome;
    CasebookListCommand list;
    CasebookExportCommand write;
};
CLI::App* setup(CLI::App& app, CasebookCommand& command);
int run(const CasebookRecordCommand& command, const Streams& streams);
int run(const CasebookOutcomeCommand& command, const Streams& streams);
int run(const CasebookListCommand& command, const Streams& streams);
int run(const CasebookExportCommand& command, const Streams& streams);

struct SimulateCommand {
    std::uint64_t cases = 1000;
    std::string priors = "renal-clinic";
    std::string tables = "adult";
    std::vector<std::string> exclude;
    std::vector<std::string> findings;
    double missing = 0.0;
    bool alternatives = false;
    std::string seed = "1";  ///< as typed
    int threads = 0;         ///< 0: all of the machine's
    std::string as = "csv";
    std::string out;
};
CLI::App* setup(CLI::App& app, SimulateCommand& command);
int run(const SimulateCommand& command, const Streams& streams);
struct AuditCommand {
    std::vector<std::string> files;
    std::string priors = "renal-clinic";
    std::string tables = "adult";
    std::vector<std::string> exclude;
    std::vector<std::string> by;
    std::string over;
    std::string against;
    std::string cause;
    std::vector<std::string> thresholds;  ///< as typed
    bool estimate_dependence = false;
    std::string write_groups;
    std::string level = "0.95", replicates = "2000", seed = "1", bins = "10";  ///< as typed
    std::string threads, least_cell;  ///< as typed; empty when not given
    std::string keep_tally;
    std::string from = "auto";
    std::string rejects;
    bool strict = false;
    std::string as = "text";
    std::string out;
};
CLI::App* setup(CLI::App& app, AuditCommand& command);
int run(const AuditCommand& command, const Streams& streams);

/// The whole program but for the process: parses, runs, maps every error to its exit code.
int run_program(int argc, const char* const* argv, std::ostream& out, std::ostream& err);

}  // namespace steelyard::cli
