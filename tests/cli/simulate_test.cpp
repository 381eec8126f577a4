// SPDX-License-Identifier: Apache-2.0
// Simulated cases: the same whatever the threads, read back as they were drawn, and calibrated.
#include <gtest/gtest.h>

#include <cmath>
#include <map>
#include <nlohmann/json.hpp>

#include "run_here.hpp"
#include "simulation.hpp"
#include "steelyard/cli/read_cases.hpp"
#include "steelyard/cli/weighing.hpp"
#include "steelyard/likelihoods/pattern_code.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"

namespace steelyard::test {
namespace {

using cli::Simulation;
using cli::SimulationOptions;
using likelihoods::left_out;

const likelihoods::TableSet& adult() {
    static const likelihoods::TableSet set = likelihoods::open_table_set("adult");
    return set;
}

const priors::PriorSet& clinic() {
    static const priors::PriorSet set = priors::open_prior_set("renal-clinic");
    return set;
}

/// The state of a finding in a pattern code; -1 for one that is not read.
std::vector<int> bands_read(const likelihoods::Panel& panel) {
    const std::string code = likelihoods::code_of(
        adult(),
        likelihoods::read_pattern(adult(), panel, likelihoods::derive(panel, adult().gate.chemistry)));
    std::vector<int> bands;
    for (const char state : code) {
        const auto s = static_cast<unsigned char>(state);
        bands.push_back(s < likelihoods::first_band_state ? left_out : s - likelihoods::first_band_state);
    }
    return bands;
}

std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream in(text);
    for (std::string line; std::getline(in, line);) {
        lines.push_back(line);
    }
    return lines;
}

TEST(Simulate, GivesTheSameCasesOnAnyNumberOfThreads) {
    const Outcome one =
        run_here({"simulate", "-n", "1100", "--threads", "1", "--seed", "5", "--missing", "0.2"});
    const Outcome three =
        run_here({"simulate", "-n", "1100", "--threads", "3", "--seed", "5", "--missing", "0.2"});
    ASSERT_EQ(one.code, 0) << one.err;
    EXPECT_EQ(one.out, three.out);
    const auto lines = lines_of(one.out);
    ASSERT_EQ(lines.size(), 1101U);
    EXPECT_EQ(lines[0].rfind("case,sex,age [a],serum_sodium [mmol/L],", 0), 0U) << lines[0];
    EXPECT_EQ(lines[1].rfind("larkmoor-sim-000001,", 0), 0U);
    EXPECT_EQ(lines[1100].rfind("larkmoor-sim-001100,", 0), 0U);
    EXPECT_NE(run_here({"simulate", "-n", "2", "--seed", "6"}).out,
              run_here({"simulate", "-n", "2", "--seed", "5"}).out);
    // A case does not depend on how many are drawn.
    EXPECT_EQ(lines_of(run_here({"simulate", "-n", "3", "--seed", "5", "--missing", "0.2"}).out)[3],
              lines[3]);
}

TEST(Simulate, SaysByWhichSetsTheCasesWereDrawn) {
    const Outcome outcome = run_here({"simulate", "-n", "3", "--priors", "even", "--as", "yaml"});
    const std::string err = in_one_line(outcome.err);
    EXPECT_NE(err.find("3 made-up cases, no patients, drawn by the prior set"), std::string::npos) << err;
    const std::string digest = priors::open_prior_set("even").digest;
    EXPECT_NE(err.find(digest.substr(0, 23)), std::string::npos);
    EXPECT_NE(outcome.out.find(digest), std::string::npos) << "in the file too";
    EXPECT_NE(outcome.out.find("no patients"), std::string::npos);
}

TEST(Simulate, CasesReadBackFromEachFormShowTheBandsDrawn) {
    const Simulation simulation(adult(), clinic(), {9, 0.25, {}, true});
    const WorkDir dir;
    constexpr std::size_t count = 60;
    const auto simulate = [&](const std::string& form) {
        const std::string file = dir.file("cases." + form);
        const Outcome outcome = run_here({"simulate", "-n", std::to_string(count), "--seed", "9", "--missing",
                                          "0.25", "--alternatives", "--as", form, "--out", file});
        EXPECT_EQ(outcome.code, 0) << outcome.err;
        EXPECT_EQ(outcome.out, "");
        return file;
    };
    document::Diagnostics faults;
    const auto yaml = cli::load_cases({simulate("yaml")}, adult().vocabulary(), faults);
    ASSERT_TRUE(faults.empty()) << faults.sorted().front().message;
    ASSERT_EQ(yaml.size(), count);
    const auto json_lines = lines_of(text_of(simulate("ndjson")));
    const auto csv_lines = lines_of(text_of(simulate("csv")));
    ASSERT_EQ(json_lines.size(), count);
    ASSERT_EQ(csv_lines.size(), count + 1);
    for (std::size_t i = 0; i < count; ++i) {
        const likelihoods::MadePanel made = simulation.one(i);
        EXPECT_EQ(bands_read(yaml[i]), made.shown) << i;
        EXPECT_EQ(yaml[i].final_cause, made.panel.final_cause);
        const auto json = cli::read_cases(json_lines[i], "line.json", adult().vocabulary(), faults);
        ASSERT_TRUE(faults.empty()) << faults.sorted().front().message;
        EXPECT_EQ(bands_read(json[0]), made.shown) << i;
        EXPECT_EQ(json[0].final_cause, made.panel.final_cause);
    }
}

TEST(Simulate, CsvIsWeighedByTheProgramAsTheCasesThemselves) {
    const WorkDir dir;
    const std::string file = dir.file("cases.csv");
    ASSERT_EQ(run_here({"simulate", "-n", "50", "--seed", "4", "--missing", "0.3", "--out", file}).code, 0);
    const Outcome weighed = run_here({"weigh", file, "--as", "csv"});
    ASSERT_EQ(weighed.code, 0) << weighed.err;
    const auto lines = lines_of(weighed.out);
    ASSERT_EQ(lines.size(), 51U) << weighed.out;
    const Simulation simulation(adult(), clinic(), {4, 0.3, {}, false});
    for (std::size_t i = 0; i < 50; ++i) {
        const cli::Weighing one = cli::weigh_case(adult(), clinic(), simulation.one(i).panel);
        EXPECT_NE(lines[i + 1].find("," + one.causes[one.ranking[0]].id + ","), std::string::npos)
            << lines[i + 1] << " should be led by " << one.causes[one.ranking[0]].id;
    }
}

/// Mean of posterior less share of each cause, in standard errors; the largest over the causes.
double worst_miss(const likelihoods::TableSet& tables, const priors::PriorSet& drawn_by,
                  const priors::PriorSet& weighed_by, const SimulationOptions& options, std::uint64_t cases) {
    const Simulation simulation(tables, drawn_by, options);
    likelihoods::PointReader reader(tables);
    std::map<std::string, std::pair<double, double>> sums;
    for (std::uint64_t i = 0; i < cases; ++i) {
        const likelihoods::MadePanel made = simulation.one(i, &reader);
        const cli::Weighing weighing = cli::weigh_case(tables, weighed_by, made.panel);
        EXPECT_TRUE(weighing.weighed);
        for (const cli::WeighedCause& cause : weighing.causes) {
            const double miss = cause.posterior - (cause.id == *made.panel.final_cause ? 1.0 : 0.0);
            sums[cause.id].first += miss;
            sums[cause.id].second += miss * miss;
        }
    }
    double worst = 0.0;
    for (const auto& [cause, sum] : sums) {
        worst = std::max(worst, std::abs(sum.first) / std::sqrt(sum.second));
    }
    return worst;
}

TEST(Simulate, PosteriorsOfSimulatedCasesAreCalibrated) {
    likelihoods::TableSet apart = adult();
    apart.groups.clear();  // findings are drawn apart given the cause
    // Within four standard errors, with everything drawn, some left out, and alternatives.
    EXPECT_LT(worst_miss(apart, clinic(), clinic(), {1, 0.0, {}, false}, 800), 4.0);
    EXPECT_LT(worst_miss(apart, clinic(), clinic(), {2, 0.4, {}, true}, 800), 4.0);
    EXPECT_LT(worst_miss(apart, clinic(), clinic(),
                         {3, 0.0, {"serum_potassium", "gfr", "fe_urate", "tmp_gfr"}, false}, 800),
              4.0);
    // And a wrong prior shows.
    EXPECT_GT(worst_miss(apart, clinic(), priors::open_prior_set("even"), {1, 0.6, {}, false}, 800), 4.0);
}

TEST(Simulate, DrawsCausesByThePriorAndBandsByTheRow) {
    const Simulation simulation(adult(), clinic(), {11, 0.0, {"serum_potassium"}, false});
    std::map<std::string, int> causes;
    std::map<int, int> bands;
    constexpr int count = 3000;
    likelihoods::PointReader reader(adult());
    for (std::uint64_t i = 0; i < count; ++i) {
        const likelihoods::MadePanel made = simulation.one(i, &reader);
        ++causes[*made.panel.final_cause];
        if (*made.panel.final_cause == "renal_failure") {
            ++bands[made.shown[0]];
        }
    }
    for (const priors::PriorCause& cause : clinic().causes) {
        const double error = std::sqrt(cause.probability * (1.0 - cause.probability) * count);
        EXPECT_NEAR(causes[cause.id], cause.probability * count, 4.0 * error) << cause.id;
    }
    const Eigen::ArrayXXd row =
        likelihoods::band_probabilities(adult(), adult().tables[0], {"renal_failure"});
    const double patients = causes["renal_failure"];
    for (Eigen::Index b = 0; b < row.rows(); ++b) {
        const double error = std::sqrt(row(b, 0) * (1.0 - row(b, 0)) * patients);
        EXPECT_NEAR(bands[static_cast<int>(b)], row(b, 0) * patients, 4.0 * error + 1.0) << b;
    }
}

TEST(Simulate, DrawsOnlyTheFindingsAskedForAndOneOfAlternatives) {
    const Simulation some(adult(), clinic(), {1, 0.0, {"gfr", "urine_anion_gap"}, false});
    const Simulation any(adult(), clinic(), {1, 0.0, {}, true});
    const Simulation preferred(adult(), clinic(), {1, 0.0, {}, false});
    std::map<std::string, int> shown;
    for (std::uint64_t i = 0; i < 60; ++i) {
        const auto few = some.one(i).shown;
        const auto of_any = any.one(i).shown;
        const auto of_preferred = preferred.one(i).shown;
        int ammonium = 0;
        for (std::size_t t = 0; t < few.size(); ++t) {
            const std::string& finding = adult().tables[t].finding;
            if (finding != "gfr" && finding != "urine_anion_gap") {
                EXPECT_EQ(few[t], left_out) << finding;
            }
            if (finding == "urine_ammonium" || finding == "urine_osmolal_gap" ||
                finding == "urine_anion_gap") {
                ammonium += of_any[t] == left_out ? 0 : 1;
                shown[finding] += of_any[t] == left_out ? 0 : 1;
                EXPECT_TRUE(of_preferred[t] == left_out || finding == "urine_ammonium");
            }
        }
        EXPECT_LE(ammonium, 1);
    }
    EXPECT_EQ(shown.size(), 3U);
    for (const auto& [finding, count] : shown) {
        EXPECT_GT(count, 3) << finding;
    }
}

TEST(Simulate, LeavesFindingsOutWithTheChanceAskedFor) {
    const Simulation simulation(adult(), clinic(), {1, 0.3, {"nephrocalcinosis"}, false});
    int missing = 0;
    for (std::uint64_t i = 0; i < 400; ++i) {
        const auto shown = simulation.one(i).shown;
        missing +=
            std::count(shown.begin(), shown.end(), left_out) == static_cast<long>(shown.size()) ? 1 : 0;
    }
    EXPECT_NEAR(missing, 120, 37);
}

class WrongSimulation : public ::testing::TestWithParam<std::vector<std::string>> {};

TEST_P(WrongSimulation, ExitsWithTwoAndWritesNothing) {
    const WorkDir dir;
    std::vector<std::string> words = {"simulate", "-n", "5"};
    words.insert(words.end(), GetParam().begin(), GetParam().end());
    const Outcome outcome = run_here(words);
    EXPECT_EQ(outcome.code, 2) << outcome.err;
    EXPECT_EQ(outcome.out, "");
    EXPECT_NE(outcome.err, "");
}

INSTANTIATE_TEST_SUITE_P(
    Words, WrongSimulation,
    ::testing::Values(std::vector<std::string>{"-n", "0"}, std::vector<std::string>{"-n", "many"},
                      std::vector<std::string>{"--missing", "1.5"},
                      std::vector<std::string>{"--missing", "-0.1"},
                      std::vector<std::string>{"--findings", "serum_potasium"},
                      std::vector<std::string>{"--seed", "-1"}, std::vector<std::string>{"--threads", "0"},
                      std::vector<std::string>{"--as", "json"},
                      std::vector<std::string>{"--exclude", "proximl"}, std::vector<std::string>{"extra"},
                      std::vector<std::string>{"--out", "/nowhere/at/all"}));

TEST(Simulate, RefusesInvalidSets) {
    EXPECT_EQ(run_here({"simulate", "--priors", "no-such-set"}).code, 3);
    EXPECT_EQ(run_here({"simulate", "--tables", "no-such-set"}).code, 3);
}

}  // namespace
}  // namespace steelyard::test
