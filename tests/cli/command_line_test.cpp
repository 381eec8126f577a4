// SPDX-License-Identifier: Apache-2.0
// The command line itself: help, versions, wrong words, exit codes.
#include <gtest/gtest.h>

#include <sstream>

#include "run_program.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::test {
namespace {

const std::vector<std::vector<std::string>> all_commands = {{},
                                                            {"weigh"},
                                                            {"tables"},
                                                            {"tables", "show"},
                                                            {"tables", "check"},
                                                            {"priors"},
                                                            {"priors", "show"},
                                                            {"casebook"},
                                                            {"casebook", "record"},
                                                            {"casebook", "outcome"},
                                                            {"casebook", "list"},
                                                            {"casebook", "export"},
                                                            {"simulate"},
                                                            {"audit"}};

TEST(Help, EveryCommandExplainsItselfOnStandardOutput) {
    for (std::vector<std::string> command : all_commands) {
        command.emplace_back("--help");
        const Outcome outcome = run(command);
        EXPECT_EQ(outcome.code, 0);
        EXPECT_EQ(outcome.err, "");
        EXPECT_GT(outcome.out.size(), 200U);
    }
}

TEST(Version, SaysTheNumberAndWhatTheProgramIsNot) {
    const Outcome outcome = run({"--version"});
    EXPECT_EQ(outcome.code, 0);
    EXPECT_EQ(outcome.out.rfind("steelyard " STEELYARD_VERSION, 0), 0U) << outcome.out;
    EXPECT_NE(in_one_line(outcome.out).find("not a medical device"), std::string::npos);
}

class WrongCommandLine : public ::testing::TestWithParam<std::vector<std::string>> {};

TEST_P(WrongCommandLine, ExitsWithTwoAndPrintsNoResult) {
    const Outcome outcome = run(GetParam(), "case: larkmoor-901\nserum: {potassium: 2.8 mmol/L}\n");
    EXPECT_EQ(outcome.code, 2) << outcome.err;
    EXPECT_EQ(outcome.out, "");
    EXPECT_NE(outcome.err, "");
}

INSTANTIATE_TEST_SUITE_P(
    Words, WrongCommandLine,
    ::testing::Values(
        std::vector<std::string>{}, std::vector<std::string>{"weight"}, std::vector<std::string>{"weigh"},
        std::vector<std::string>{"weigh", "-", "--as", "xml"},
        std::vector<std::string>{"weigh", "-", "--prior"}, std::vector<std::string>{"weigh", "-", "--priors"},
        std::vector<std::string>{"weigh", "-", "--exclude", "proximl"},
        std::vector<std::string>{"weigh", "-", "--exclude", "proximal", "--exclude", "classic_distal",
                                 "--exclude", "voltage_distal", "--exclude", "low_aldosterone", "--exclude",
                                 "renal_failure"},
        std::vector<std::string>{"weigh", "-", "--out", "/nowhere/at/all"},
        std::vector<std::string>{"weigh", "-", "--out", "/"}, std::vector<std::string>{"tables"},
        std::vector<std::string>{"tables", "show", "--finding", "serum_potasium"},
        std::vector<std::string>{"tables", "show", "--cause", "proximal"},
        std::vector<std::string>{"tables", "show", "--cause", "proximal", "--against", "proximal"},
        std::vector<std::string>{"tables", "show", "--cause", "proximal", "--against", "distal"},
        std::vector<std::string>{"priors", "shew"},
        std::vector<std::string>{"--colour", "mauve", "priors", "show"}));

TEST(WrongWords, NameTheNearestRightOne) {
    EXPECT_NE(in_one_line(run({"weigh", "-", "--exclude", "proximl"}, "case: a1\n").err)
                  .find("did you mean proximal?"),
              std::string::npos);
    EXPECT_NE(in_one_line(run({"tables", "show", "-f", "serum_potasium"}).err)
                  .find("did you mean serum_potassium?"),
              std::string::npos);
}

TEST(TablesShow, GivesRatiosOfAnyCauseAgainstAnyOther) {
    const Outcome outcome = run({"tables", "show", "--finding", "urine_anion_gap", "--cause",
                                 "classic_distal", "--against", "extrarenal"});
    EXPECT_EQ(outcome.code, 0);
    EXPECT_EQ(outcome.err, "");
    EXPECT_NE(outcome.out.find("95 % interval"), std::string::npos) << outcome.out;
    EXPECT_NE(outcome.out.find("Caution: "), std::string::npos);
}

TEST(TablesCheck, FindsTheShippedSetSound) {
    const Outcome outcome = run({"tables", "check"});
    EXPECT_EQ(outcome.code, 0);
    EXPECT_NE(outcome.out.find("sound."), std::string::npos);
}

TEST(TablesCheck, ReportsTheSoundAndRefusesTheFaulty) {
    const WorkDir dir;
    dir.write("ours/set.yaml", "format: steelyard.table-set/1\ntitle: Ours\n");
    const Outcome outcome = run({"tables", "check", "adult", dir.file("ours")});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.out.find("sound."), std::string::npos);
    EXPECT_NE(outcome.err.find("error[missing-key]"), std::string::npos) << outcome.err;
}

TEST(PriorsShow, GivesProbabilitiesRangesAndGrounds) {
    for (const char* name :
         {"renal-clinic", "general-ward", "even", "renal-causes", "renal-clinic-overlap"}) {
        const Outcome outcome = run({"priors", "show", name});
        EXPECT_EQ(outcome.code, 0) << outcome.err;
        EXPECT_NE(outcome.out.find("Caution: "), std::string::npos);
    }
}

TEST(Text, FitsEightyColumns) {
    std::vector<std::vector<std::string>> commands = {
        {"tables", "show"},
        {"tables", "check"},
        {"priors", "show"},
        {"tables", "show", "--cause", "proximal", "--against", "extrarenal"},
        {"--help"},
        {"weigh", "--help"},
        {"tables", "show", "--help"},
        {"priors", "show", "--help"},
        {"--version"}};
    for (std::vector<std::string> command : all_commands) {
        command.emplace_back("--help");
        commands.push_back(command);
    }
    for (const std::vector<std::string>& command : commands) {
        std::istringstream lines(run(command).out);
        for (std::string line; std::getline(lines, line);) {
            EXPECT_LE(cli::text_width(line), cli::page_width) << command.front() << ": " << line;
        }
    }
}

}  // namespace
}  // namespace steelyard::test
