// SPDX-License-Identifier: Apache-2.0
// The command table, and the one place where errors become exit codes.
#include <fmt/format.h>
#include <unistd.h>

#include <functional>
#include <map>
#include <memory>
#include <ostream>
#include <system_error>

#include "help_formatter.hpp"
#include "open_inputs.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/cli/version.hpp"

namespace steelyard::cli {
namespace {

/// The subcommand of `casebook` that was asked for.
int run_casebook(const CLI::App& app, const CasebookCommand& command, const Streams& streams) {
    if (app.got_subcommand("record")) {
        return run(command.record, streams);
    }
    if (app.got_subcommand("outcome")) {
        return run(command.outcome, streams);
    }
    return app.got_subcommand("list") ? run(command.list, streams) : run(command.write, streams);
}

constexpr const char* program_description =
    "Weighs which cause best explains a normal-gap (hyperchloraemic) metabolic acidosis: proximal, classic "
    "distal, "
    "voltage-dependent distal or low-aldosterone renal tubular acidosis, renal failure, or bicarbonate lost "
    "outside the "
    "kidney. A clinic supplies prior odds, evidence tables supply likelihoods; the result is a probability "
    "for each cause "
    "and what it rests on.";

/// What --version prints besides the number: what the program is for, and what it is not.
std::string version_text() {
    return fmt::format("steelyard {}\n{}", version(), wrapped(caution_text, "", ""));
}

/// Runs a command and maps what it throws to an exit code.
int guarded(const std::function<int()>& command, const Streams& streams) {
    try {
        return command();
    } catch (const document::LoadError& error) {
        document::print(streams.err, error.faults(), streams.colour_err);
        const std::size_t count = error.faults().size();
        streams.err << fmt::format("steelyard: {} fault{} found; nothing was done\n", count,
                                   count == 1 ? "" : "s");
        return invalid_input;
    } catch (const UsageError& error) {
        streams.err << wrapped(fmt::format("steelyard: {}", error.what()), "", "  ");
        return usage;
    } catch (const OutputError& error) {
        streams.err << wrapped(fmt::format("steelyard: {}", visible(error.what())), "", "  ");
        return usage;
    } catch (const std::bad_alloc&) {
        streams.err << "steelyard: out of memory\n";
        return failure;
    } catch (const std::exception& error) {
        streams.err << wrapped(
            fmt::format("steelyard: unexpected failure, this is a bug: {}", visible(error.what())), "", "  ");
        return failure;
    }
}

}  // namespace

int run_program(int argc, const char* const* argv, std::ostream& out, std::ostream& err) {
    CLI::App app{program_description, "steelyard"};
    app.set_version_flag("--version", version_text(), "Print the version and what the program is for");
    app.formatter(std::make_shared<HelpFormatter>());
    app.get_formatter()->column_width(24);
    app.require_subcommand(1);
    app.footer(
        wrapped(std::string("Caution: ") + caution_text, "", "") + "\n" +
        wrapped("`steelyard COMMAND --help` explains a command. Formats and methods are described in docs/.",
                "", ""));
    Colour colour = Colour::automatic;
    const std::map<std::string, Colour> choices = {
        {"auto", Colour::automatic}, {"always", Colour::always}, {"never", Colour::never}};
    app.add_option("--colour", colour, "Colour: auto (only on a terminal), always or never")
        ->transform(CLI::CheckedTransformer(choices))
        ->option_text("WHEN");

    WeighCommand weigh;
    AuditCommand audit;
    TablesCommand tables;
    PriorsCommand priors;
    CLI::App* weigh_app = setup(app, weigh);
    CLI::App* audit_app = setup(app, audit);
    CLI::App* tables_app = setup(app, tables);
    CLI::App* priors_app = setup(app, priors);
    SimulateCommand simulate;
    const CLI::App* simulate_app = setup(app, simulate);
    CasebookCommand casebook;
    const CLI::App* casebook_app = setup(app, casebook);

    try {
        app.parse(argc, argv);
    } catch (const CLI::Success& success) {
        app.exit(success, out, err);
        return done;
    } catch (const CLI::ParseError& error) {
        err << wrapped(fmt::format("steelyard: {}", visible(error.what())), "", "  ");
        const auto chosen = app.get_subcommands();
        err << fmt::format("Try: steelyard {}--help\n",
                           chosen.empty() ? "" : chosen.front()->get_name() + " ");
        return usage;
    }
    const Streams streams{out, err, wants_colour(colour, STDOUT_FILENO), wants_colour(colour, STDERR_FILENO),
                          isatty(STDERR_FILENO) != 0};
    return guarded(
        [&]() -> int {
            if (weigh_app->parsed()) {
                return run(weigh, streams);
            }
            if (audit_app->parsed()) {
                return run(audit, streams);
            }
            if (tables_app->parsed()) {
                return tables_app->got_subcommand("check") ? run(tables.check, streams)
                                                           : run(tables.show, streams);
            }
            if (simulate_app->parsed()) {
                return run(simulate, streams);
            }
            if (casebook_app->parsed()) {
                return run_casebook(*casebook_app, casebook, streams);
            }
            return priors_app->parsed() ? run(priors.show, streams) : usage;
        },
        streams);
}

}  // namespace steelyard::cli
