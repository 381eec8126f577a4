// SPDX-License-Identifier: Apache-2.0
// `steelyard weigh` as a consultant runs it: the built program over the Larkmoor cases and over cases made
// here.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <map>
#include <nlohmann/json.hpp>
#include <sstream>

#include "larkmoor_cases.hpp"
#include "run_program.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::test {
namespace {

using Json = nlohmann::json;

const char* const classic_case = R"(case: larkmoor-900
sex: female
age: 47 a
serum: {sodium: 139 mmol/L, potassium: 2.9 mmol/L, chloride: 115 mmol/L, bicarbonate: 14 mmol/L, albumin: 38 g/L, creatinine: 74 umol/L}
arterial: {ph: 7.28, pco2: 30 mmHg}
urine: {ph: 6.4, sodium: 60 mmol/L, potassium: 32 mmol/L, chloride: 62 mmol/L}
observed: {nephrocalcinosis: present}
)";

Json report_of(const std::vector<std::string>& arguments, const std::string& input = {}) {
    std::vector<std::string> words = {"weigh", "--as", "json", "--draws", "1000"};
    words.insert(words.end(), arguments.begin(), arguments.end());
    const Outcome outcome = run(words, input);
    EXPECT_TRUE(outcome.code == 0 || outcome.code == 4) << outcome.err;
    return Json::parse(outcome.out).at(0);
}

std::map<std::string, double> posterior_of(const Json& report) {
    std::map<std::string, double> result;
    for (const Json& cause : report["causes"]) {
        result[cause["id"]] = cause["posterior"];
    }
    return result;
}

std::string leader_of(const Json& report) {
    const auto posterior = posterior_of(report);
    return std::max_element(posterior.begin(), posterior.end(),
                            [](const auto& a, const auto& b) { return a.second < b.second; })
        ->first;
}

class LarkmoorCase : public ::testing::TestWithParam<std::string> {};

TEST_P(LarkmoorCase, IsReadWithoutFaultAndReportedInEightyColumns) {
    const Outcome outcome = run({"weigh", GetParam(), "--draws", "1000"});
    EXPECT_TRUE(outcome.code == 0 || outcome.code == 4) << outcome.err;
    EXPECT_EQ(outcome.err.empty(), outcome.code == 0) << outcome.err;
    EXPECT_NE(outcome.out.find("Caution: "), std::string::npos);
    std::istringstream lines(outcome.out);
    for (std::string line; std::getline(lines, line);) {
        EXPECT_LE(cli::text_width(line), cli::page_width) << line;
        EXPECT_EQ(line.find('\x1b'), std::string::npos) << "colour without a terminal";
    }
}

TEST_P(LarkmoorCase, GivesProbabilitiesThatFollowFromItsOwnLedger) {
    const Json report = report_of({GetParam(), "--weigh-anyway"});
    double sum = 0.0;
    std::map<std::string, double> score;
    for (const Json& cause : report["causes"]) {
        sum += cause["posterior"].get<double>();
        score[cause["id"]] = std::log(cause["prior"].get<double>());
    }
    EXPECT_NEAR(sum, 1.0, 1e-12);
    for (const Json& line : report["ledger"]) {
        for (auto& [cause, value] : score) {
            if (line["used"].get<bool>()) {
                value += line["weight"].get<double>() * line["log_likelihood"][cause].get<double>();
            }
        }
    }
    const auto posterior = posterior_of(report);
    const std::string leader = leader_of(report);
    for (const auto& [cause, value] : score) {
        EXPECT_NEAR(std::log(posterior.at(cause) / posterior.at(leader)), value - score[leader], 1e-9)
            << cause;
    }
}

TEST_P(LarkmoorCase, DropsNothingInSilence) {
    const Json report = report_of({GetParam(), "--weigh-anyway"});
    std::size_t told = report["missing"].size();
    for (const Json& line : report["ledger"]) {
        ++told;
        EXPECT_EQ(line["used"].get<bool>(), line["why_not"].is_null());
        EXPECT_TRUE(line["used"].get<bool>() || !line["why_not"].get<std::string>().empty());
    }
    const Json tables = Json::parse(run({"tables", "show", "--as", "json"}).out);
    EXPECT_EQ(told, tables["findings"].size()) << "every finding is read, set aside or missing";
}

INSTANTIATE_TEST_SUITE_P(Folder, LarkmoorCase, ::testing::ValuesIn(larkmoor_cases()), larkmoor_name);

TEST(LarkmoorCases, AreAtLeastTwelve) {
    EXPECT_GE(larkmoor_cases().size(), 12U);
}

TEST(Weigh, PutsUrgentValuesBeforeEverythingElse) {
    std::string text = classic_case;
    text.replace(text.find("2.9 mmol/L"), 10, "2.1 mmol/L");
    const Outcome outcome = run({"weigh", "-"}, text);
    EXPECT_EQ(outcome.code, 0);
    const std::size_t urgent = outcome.out.find("URGENT");
    ASSERT_NE(urgent, std::string::npos) << outcome.out;
    EXPECT_LT(urgent, outcome.out.find("Does the question apply?"));
    EXPECT_LT(urgent, outcome.out.find("How likely each cause is"));
    const Json report = report_of({"-"}, text);
    EXPECT_EQ(report["urgent"][0]["quantity"], "serum_potassium");
    EXPECT_EQ(report["urgent"][0]["side"], "low");
    EXPECT_EQ(report["urgent"][0]["limit"], 2.8);
}

TEST(Weigh, ComputesTheGateAsPublishedFormulasDo) {
    // Na 139, Cl 115, HCO3 14, albumin 38: gap 10; corrected 10 + 0.25 x (40 - 38) = 10.5 (Figge 1998 slope);
    // expected pCO2 1.5 x 14 + 8 = 29 (common rounding of Albert, Dell and Winters 1967); worked by hand.
    const Json gate = report_of({"-"}, classic_case)["gate"];
    EXPECT_EQ(gate["status"], "in_scope");
    EXPECT_NEAR(gate["quantities"]["anion_gap"].get<double>(), 10.0, 1e-9);
    EXPECT_NEAR(gate["quantities"]["anion_gap_corrected"].get<double>(), 10.5, 1e-9);
    EXPECT_NEAR(gate["quantities"]["expected_pco2"].get<double>(), 29.0, 1e-9);
}

TEST(Weigh, GivesNoPosteriorOutOfScopeUnlessAsked) {
    // pH 7.48 with pCO2 20: a respiratory alkalosis.
    const std::string text =
        "case: larkmoor-901\nserum: {sodium: 140 mmol/L, chloride: 112 mmol/L, bicarbonate: 15 mmol/L}\n"
        "arterial: {ph: 7.48, pco2: 20 mmHg}\n";
    const Outcome outcome = run({"weigh", "-"}, text);
    EXPECT_EQ(outcome.code, 4);
    EXPECT_EQ(outcome.out.find("How likely each cause is"), std::string::npos);
    EXPECT_NE(outcome.out.find("Caution: "), std::string::npos);
    EXPECT_NE(outcome.err.find("out of scope"), std::string::npos);
    EXPECT_TRUE(report_of({"-"}, text)["causes"].empty());
    const Outcome anyway = run({"weigh", "-", "--weigh-anyway"}, text);
    EXPECT_EQ(anyway.code, 0);
    EXPECT_NE(anyway.out.find("Weighed because it was asked for"), std::string::npos);
}

TEST(Weigh, IsThePriorWhenNothingCanBeRead) {
    const Json report = report_of({"-", "--priors", "general-ward"}, "case: larkmoor-902\n");
    for (const Json& cause : report["causes"]) {
        EXPECT_NEAR(cause["prior"].get<double>(), cause["posterior"].get<double>(), 1e-15);
    }
    EXPECT_NE(report["summary"]["separation"].get<std::string>().find("prior odds alone"), std::string::npos);
}

TEST(Weigh, LeavesOutWhatThePriorSetOrTheUserLeavesOut) {
    const auto five = posterior_of(report_of({"-", "--priors", "renal-causes"}, classic_case));
    EXPECT_EQ(five.size(), 5U);
    EXPECT_FALSE(five.contains("extrarenal"));
    const Json without = report_of({"-", "--exclude", "extrarenal"}, classic_case);
    EXPECT_FALSE(posterior_of(without).contains("extrarenal"));
    bool told = false;
    for (const Json& entry : without["left_out"]) {
        told = told || (entry["id"] == "extrarenal" && entry["why"] == "excluded on the command line");
    }
    EXPECT_TRUE(told);
    // Leaving a cause out keeps the odds among the rest.
    const auto all = posterior_of(report_of({"-"}, classic_case));
    const auto some = posterior_of(without);
    EXPECT_NEAR(std::log(all.at("proximal") / all.at("classic_distal")),
                std::log(some.at("proximal") / some.at("classic_distal")), 1e-12);
}

TEST(Weigh, AsksToTakeJudgedPercentagesAsARanking) {
    const std::string report = in_one_line(run({"weigh", "-"}, classic_case).out);
    EXPECT_NE(report.find("on judgement or memory. Take the percentages as a ranking"), std::string::npos)
        << report;
    EXPECT_NE(report.find("95 % interval"), std::string::npos);
}

TEST(Weigh, ReadsTheCompositeCauseWhenThePriorsNameIt) {
    const auto posterior = posterior_of(report_of({"-", "--priors", "renal-clinic-overlap"}, classic_case));
    EXPECT_TRUE(posterior.contains("low_aldosterone_renal_failure"));
}

TEST(Weigh, GivesTheSameAnswerForTheSamePanelInOtherUnits) {
    const std::string conventional = R"(case: larkmoor-900
sex: female
age: 47 a
serum: {sodium: 139 mEq/L, potassium: 2.9 mEq/L, chloride: 115 mEq/L, bicarbonate: 14 mEq/L, albumin: 3.8 g/dL, creatinine: 0.837090 mg/dL}
arterial: {ph: 7.28, pco2: 4.0 kPa}
urine: {ph: 6.4, sodium: 60 mEq/L, potassium: 32 mEq/L, chloride: 62 mEq/L}
observed: {nephrocalcinosis: present}
)";
    const auto si = posterior_of(report_of({"-"}, classic_case));
    for (const auto& [cause, value] : posterior_of(report_of({"-"}, conventional))) {
        EXPECT_NEAR(value, si.at(cause), 1e-12) << cause;
    }
}

TEST(Weigh, SetsTheUrineAnionGapAsideWhenTheUrineIsAlkalineAndSaysWhy) {
    std::string text = classic_case;
    text.replace(text.find("urine: {ph: 6.4"), 15, "urine: {ph: 7.4");
    bool found = false;
    const Json report = report_of({"-"}, text);
    for (const Json& line : report["ledger"]) {
        if (line["finding"] == "urine_anion_gap") {
            found = true;
            EXPECT_FALSE(line["used"].get<bool>());
            EXPECT_FALSE(line["why_not"].get<std::string>().empty());
        }
    }
    EXPECT_TRUE(found);
}

TEST(Weigh, WritesManyCasesInOrderAsJsonLinesOrAnArray) {
    const std::string two =
        "- {case: larkmoor-911, serum: {potassium: 3.1 mmol/L}}\n- {case: larkmoor-912, serum: {potassium: "
        "5.9 mmol/L}}\n";
    const Outcome lines = run({"weigh", "-", "--as", "ndjson"}, two);
    EXPECT_EQ(lines.code, 0);
    EXPECT_EQ(std::count(lines.out.begin(), lines.out.end(), '\n'), 2);
    const Json array = Json::parse(run({"weigh", "-", "--as", "json"}, two).out);
    ASSERT_EQ(array.size(), 2U);
    EXPECT_EQ(array[0]["case"], "larkmoor-911");
    EXPECT_EQ(array[1]["case"], "larkmoor-912");
    EXPECT_EQ(Json::parse(lines.out.substr(0, lines.out.find('\n'))), array[0]);
}

TEST(Weigh, ReadsJsonCasesAsItReadsYaml) {
    const std::string json = R"({"case": "larkmoor-900", "sex": "female", "age": "47 a",
 "serum": {"sodium": "139 mmol/L", "potassium": "2.9 mmol/L", "chloride": "115 mmol/L", "bicarbonate": "14 mmol/L", "albumin": "38 g/L", "creatinine": "74 umol/L"},
 "arterial": {"ph": 7.28, "pco2": "30 mm[Hg]"},
 "urine": {"ph": 6.4, "sodium": "60 mmol/L", "potassium": "32 mmol/L", "chloride": "62 mmol/L"},
 "observed": {"nephrocalcinosis": "present"}})";
    EXPECT_EQ(report_of({"-"}, json), report_of({"-"}, classic_case));
}

TEST(Weigh, WritesAFileWholeAndPrintsNothing) {
    const WorkDir dir;
    const Outcome outcome = run({"weigh", "-", "--out", dir.file("report.txt")}, classic_case);
    EXPECT_EQ(outcome.code, 0);
    EXPECT_EQ(outcome.out, "");
    EXPECT_EQ(text_of(dir.file("report.txt")), run({"weigh", "-"}, classic_case).out);
    const Outcome bad =
        run({"weigh", "-", "--out", dir.file("report.txt")}, "case: x1\nserum: {potassium: 2.8}\n");
    EXPECT_EQ(bad.code, 3);
    EXPECT_EQ(text_of(dir.file("report.txt")), run({"weigh", "-"}, classic_case).out)
        << "a failed run must leave the older result alone";
}

TEST(Weigh, GivesTheSameBytesEveryTime) {
    EXPECT_EQ(run({"weigh", "-", "--as", "json"}, classic_case).out,
              run({"weigh", "-", "--as", "json"}, classic_case).out);
}

/// The shipped tables in a folder of the test's own, with some of their text replaced.
std::string altered_tables(const WorkDir& dir, const std::string& file, const std::string& from,
                           const std::string& to) {
    const std::filesystem::path folder = dir.path() / "tables";
    std::filesystem::copy(STEELYARD_SOURCE_DIR "/likelihoods/tables/adult", folder);
    std::string text = text_of(folder / file);
    const std::size_t at = text.find(from);
    EXPECT_NE(at, std::string::npos) << from;
    text.replace(at, from.size(), to);
    dir.write("tables/" + file, text);
    return folder.string();
}

TEST(Weigh, ShowsHostileTextAsTextOnly) {
    const std::string mark = "\xe2\x80\xae";  // right-to-left override, U+202E
    std::string text = classic_case;
    text.replace(text.find("larkmoor-900"), 12, "\"larkmoor-" + mark + "<b>900\"");
    const WorkDir dir;
    const std::string tables =
        altered_tables(dir, "set.yaml", "title: Classic distal", "title: Classic" + mark + " distal");
    for (const std::string command : {"weigh", "tables", "priors"}) {
        const Outcome outcome = command == "weigh"    ? run({"weigh", "-", "--tables", tables}, text)
                                : command == "tables" ? run({"tables", "show", tables})
                                                      : run({"priors", "show", "--tables", tables});
        EXPECT_EQ(outcome.code, 0) << outcome.err;
        EXPECT_EQ(outcome.out.find(mark), std::string::npos) << command;
        EXPECT_NE(outcome.out.find("\\u202e"), std::string::npos) << command;
    }
    // An escape sequence does not even get in.
    EXPECT_EQ(run({"weigh", "-"}, "case: \"larkmoor-\\x1b[31m\"\n").code, 3);
    EXPECT_EQ(run({"weigh", "-"}, "case: larkmoor-\x1b[31m\n").code, 3);
}

TEST(Weigh, TakesAFolderWhoseNameIsNotUtf8) {
    const WorkDir dir;
    std::filesystem::copy(STEELYARD_SOURCE_DIR "/likelihoods/tables/adult", dir.path() / "t\xff");
    const Outcome outcome = run({"weigh", "-", "--as", "json", "--tables", dir.file("t\xff")}, classic_case);
    EXPECT_EQ(outcome.code, 0) << outcome.err;
    EXPECT_EQ(Json::parse(outcome.out).size(), 1U);
}

std::string many_cases(int count) {
    std::string text;
    for (int i = 0; i < count; ++i) {
        text += "- {case: larkmoor-" + std::to_string(i) + ", serum: {potassium: 3.1 mmol/L}}\n";
    }
    return text;
}

TEST(Weigh, TreatsAClosedPipeAsSuccess) {
    const WorkDir dir;
    // Far more than a pipe holds, so that the writer is still writing when the reader has gone.
    const std::string path = dir.write("cases.yaml", many_cases(40));
    const std::string command =
        std::string("bash -c 'set -o pipefail; " STEELYARD_PROGRAM " weigh --draws 1000 ") + path +
        " | head -c 1 >/dev/null'";
    EXPECT_EQ(std::system(command.c_str()), 0);  // NOLINT: the test's own words
}

TEST(Weigh, SaysSoWhenStandardOutputIsFull) {
    const WorkDir dir;
    const std::string path = dir.write("case.yaml", classic_case);
    const std::string command = std::string("bash -c '" STEELYARD_PROGRAM " weigh ") + path +
                                " >/dev/full 2>" + dir.file("err") + "; test $? -eq 2'";
    EXPECT_EQ(std::system(command.c_str()), 0);  // NOLINT: the test's own words
    EXPECT_NE(text_of(dir.file("err")).find("cannot write the result"), std::string::npos);
}

TEST(Weigh, RefusesACompositeWithoutItsParts) {
    const WorkDir dir;
    const std::string priors = dir.write("priors.yaml", R"(format: steelyard.prior-set/1
title: Larkmoor
given_as: weights
causes:
  proximal: {weight: 1}
  low_aldosterone_renal_failure: {weight: 1}
)");
    const Outcome outcome = run({"weigh", "-", "--priors", priors}, classic_case);
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.err.find(priors + ":6:3: error[composite-without-parts]"), std::string::npos)
        << outcome.err;
}

TEST(Weigh, ShowsALimitAsALimit) {
    const std::string text = "case: larkmoor-905\nserum: {potassium: <2.0 mmol/L, bicarbonate: 14 mmol/L}\n";
    const std::string report = run({"weigh", "-"}, text).out;
    EXPECT_NE(report.find("Serum potassium below 2.0 mmol/L is at or below 2.8 mmol/L"), std::string::npos)
        << report;
    const std::string maybe =
        run({"weigh", "-"}, "case: larkmoor-905\nserum: {potassium: <3.0 mmol/L}\n").out;
    EXPECT_NE(maybe.find("may be at or below"), std::string::npos) << maybe;
}

TEST(Weigh, ShowsWhatNoTableReads) {
    const Json report =
        report_of({"-"}, "case: larkmoor-903\nserum: {potassium: 3.1 mmol/L, magnesium: 0.8 mmol/L}\n");
    EXPECT_EQ(report["unread"], Json::array({"serum_magnesium"}));
}

TEST(Weigh, NeverWordsItsAnswerAsADiagnosis) {
    for (const std::string& path : larkmoor_cases()) {
        const std::string text = run({"weigh", path, "--weigh-anyway", "--full", "--draws", "1000"}).out;
        for (const char* verdict :
             {"diagnosis is", "The patient has", "is diagnosed", "confirms", "proves", "ruled out"}) {
            EXPECT_EQ(text.find(verdict), std::string::npos) << verdict << " in " << path;
        }
    }
}

TEST(WeighJson, HasLinesInDecibansThatAddUpToThePosteriorOdds) {
    const Json report = report_of({"-"}, classic_case);
    auto posterior = posterior_of(report);
    const std::string leader = leader_of(report);
    std::map<std::string, double> prior;
    for (const Json& cause : report["causes"]) {
        prior[cause["id"]] = cause["prior"];
    }
    std::string next;
    for (const auto& [cause, value] : posterior) {
        if (cause != leader && (next.empty() || value > posterior[next])) {
            next = cause;
        }
    }
    double total = 10.0 * std::log10(prior[leader] / prior[next]);
    for (const Json& line : report["ledger"]) {
        if (line["used"].get<bool>()) {
            total += line["decibans"].get<double>();
        }
    }
    EXPECT_NEAR(total, 10.0 * std::log10(posterior[leader] / posterior[next]), 1e-9);
}

}  // namespace
}  // namespace steelyard::test
