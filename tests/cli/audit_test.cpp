// SPDX-License-Identifier: Apache-2.0
// Audits of drawn series, in which what must be found is known: the numbers are the engine's, the words
// follow the numbers, and no result depends on threads or on how the tally was split.
#include "steelyard/cli/audit.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cstdlib>

#include "audit_cells.hpp"
#include "drawn_tally.hpp"
#include "near.hpp"
#include "run_program.hpp"
#include "steelyard/cli/tally_file.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/engine/posterior.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"

namespace steelyard::cli {
namespace {

using test::drawn_tally;
using test::DrawnSeries;
using test::near_rel;
using test::run;
using test::WorkDir;

const std::string winds = STEELYARD_TEST_DIR "/data/tables/winds";
const std::string harbour = STEELYARD_TEST_DIR "/data/tables/winds-priors.yaml";

const likelihoods::TableSet& tables() {
    static const likelihoods::TableSet set = likelihoods::load_table_set(winds);
    return set;
}
const priors::PriorSet& ward() {
    static const priors::PriorSet set = priors::load_prior_set(harbour);
    return set;
}

DrawnSeries series(std::uint64_t patients) {
    DrawnSeries drawn;
    drawn.patients = patients;
    drawn.shares = {0.5, 0.3, 0.2};
    return drawn;
}

AuditAsked quickly() {
    AuditAsked asked;
    asked.replicates = 200;
    return asked;
}

Audit audited(const DrawnSeries& drawn, const AuditAsked& asked = quickly()) {
    return audit_of(drawn_tally(tables(), drawn), tables(), ward(), asked);
}

bool says(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}
std::string joined(const std::vector<std::string>& lines) {
    std::string text;
    for (const std::string& line : lines) {
        text += line + "\n";
    }
    return text;
}

TEST(Audit, GivesTheEnginesNumbersOfTheSamePosteriors) {
    DrawnSeries drawn = series(400);
    drawn.outside = 0.05;
    drawn.undiagnosed = 0.1;
    const Tally tally = drawn_tally(tables(), drawn);
    AuditAsked asked = quickly();
    asked.cause = "south";
    asked.thresholds = {0.2, 0.5};
    const Audit audit = audit_of(tally, tables(), ward(), asked);

    // Each patient alone, by Bayes' rule straight from the tables: no pattern, no cell shared.
    engine::AuditSample sample;
    std::vector<Eigen::ArrayXd> forecasts;
    std::vector<std::pair<Eigen::Index, double>> found;
    const std::vector<std::string> causes = {"north", "south", "west"};
    tally.for_each([&](const TallyCell& cell) {
        const auto place = std::find(causes.begin(), causes.end(), cell.cause);
        if (place == causes.end()) {
            return;
        }
        Eigen::ArrayXd odds(3);
        odds << 0.5, 0.3, 0.2;
        for (std::size_t t = 0; t < cell.code.size(); ++t) {
            const auto state = static_cast<unsigned char>(cell.code[t]);
            if (state >= likelihoods::first_band_state) {
                odds *= likelihoods::band_probabilities(tables(), tables().tables[t], causes)
                            .row(state - likelihoods::first_band_state)
                            .transpose();
            }
        }
        forecasts.emplace_back((odds / odds.sum()).log());
        found.emplace_back(place - causes.begin(), static_cast<double>(cell.patients));
    });
    const auto rows = static_cast<Eigen::Index>(forecasts.size());
    sample.log_forecast.resize(rows, 3);
    sample.count.setZero(rows, 3);
    for (Eigen::Index g = 0; g < rows; ++g) {
        sample.log_forecast.row(g) = forecasts[static_cast<std::size_t>(g)].transpose();
        sample.count(g, found[static_cast<std::size_t>(g)].first) = found[static_cast<std::size_t>(g)].second;
    }
    engine::AuditOptions options;
    options.replicates = 0;
    options.thresholds = {{1, 0.2}, {1, 0.5}};
    const engine::AuditFigures expected = engine::audit(sample, options);
    const nlohmann::ordered_json json = audit_json(audit);
    const auto& figures = json["figures"];
    const auto equal = [](const nlohmann::ordered_json& value, double number) {
        EXPECT_TRUE(near_rel(number, value.get<double>(), 1e-9));
    };
    equal(figures["patients"], expected.patients);
    equal(figures["scores"]["log_score"]["value"], expected.scores.log_score);
    equal(figures["scores"]["brier"]["value"], expected.scores.brier);
    equal(figures["scores"]["spiegelhalter"]["z"], expected.spiegelhalter->z);
    equal(figures["hand_till"]["value"], *expected.pairs.hand_till);
    equal(figures["temperature"]["exponent"]["value"], expected.temperature.exponent->value);
    equal(figures["leader"]["calibration_error"]["value"], expected.leader.error.value);
    equal(figures["top"][0]["value"], expected.calls.top[0].value);
    equal(figures["top"][1]["low"], expected.calls.top[1].low);
    equal(figures["net_benefit"][1]["net_benefit"]["value"], expected.net_benefit[1].value);
    equal(figures["recalibration"]["coefficients"][1][2], expected.recalibration.coefficient(1, 2));
    for (std::size_t k = 0; k < 3; ++k) {
        const engine::CauseFigures& cause = expected.cause[k];
        const auto& entry = figures["causes"][k];
        EXPECT_EQ(entry["id"], causes[k]);
        equal(entry["patients"], cause.cases);
        equal(entry["area"]["value"], cause.area->value);
        equal(entry["slope"]["value"], cause.calibration.cox->slope);
        equal(entry["intercept"]["value"], cause.calibration.cox->intercept);
        equal(entry["in_the_large"]["high"], cause.calibration.in_the_large->high);
        equal(entry["sensitivity"]["value"], expected.calls.cause[k].sensitivity->value);
        equal(entry["brier_by_bin"]["reliability"], cause.by_bin.reliability);
        for (std::size_t called = 0; called < 3; ++called) {
            equal(figures["confusion"][k][called],
                  expected.calls.confusion(static_cast<Eigen::Index>(k), static_cast<Eigen::Index>(called)));
        }
    }
}

TEST(Audit, CountsEveryPatientOnce) {
    DrawnSeries drawn = series(500);
    drawn.outside = 0.1;
    drawn.undiagnosed = 0.2;
    Tally tally = drawn_tally(tables(), drawn);
    tally.add({}, likelihoods::GateStatus::out_of_scope, "north", {}, {}, 7);
    tally.add_set_aside(3);
    for (const std::uint64_t least : {1U, 3U}) {
        const auto flow = audit_json(audit_of(tally.suppressed(least), tables(), ward(), quickly()))["flow"];
        const auto n = [&](const char* key) { return flow[key].get<std::uint64_t>(); };
        EXPECT_EQ(n("read"), 510U);
        EXPECT_EQ(n("read"), n("weighed") + n("out_of_scope") + n("set_aside"));
        EXPECT_EQ(n("weighed"), n("scored") + n("outside") + n("undiagnosed") + n("dropped"));
        EXPECT_EQ(n("dropped") > 0, least > 1);
    }
}

TEST(Audit, SaysSoWhenTheProbabilitiesCanBeBelieved) {
    const AuditWords words = words_of(audited(series(2000)));
    EXPECT_EQ(words.verdict, AuditVerdict::fits) << words.headline << joined(words.remarks);
    EXPECT_TRUE(says(words.headline, "In this series yes, as far as 2,000 patients can show"))
        << words.headline;
    EXPECT_TRUE(says(joined(words.limits), "not the clinic"));
}

TEST(Audit, DoesNotPraiseWhatFewPatientsCannotRefute) {
    const AuditWords words = words_of(audited(series(40)));
    EXPECT_EQ(words.verdict, AuditVerdict::unclear) << words.headline;
    EXPECT_TRUE(says(words.headline, "but 40 patients would show gross errors only")) << words.headline;
}

TEST(Audit, SaysSoWhenTheyAreTooSure) {
    DrawnSeries drawn = series(2000);
    drawn.strength = 0.5;
    const Audit audit = audited(drawn);
    const AuditWords words = words_of(audit);
    EXPECT_EQ(words.verdict, AuditVerdict::too_sure);
    EXPECT_TRUE(says(words.headline, "too sure")) << words.headline;
    EXPECT_TRUE(says(joined(words.remarks), "Too sure, for it or against it: Northern fever"))
        << joined(words.remarks);
    EXPECT_TRUE(says(audit_text(audit, false), "Not as they stand"));
}

TEST(Audit, SaysSoWhenTheyAreTooCautious) {
    DrawnSeries drawn = series(2000);
    drawn.strength = 2.0;
    const AuditWords words = words_of(audited(drawn));
    EXPECT_EQ(words.verdict, AuditVerdict::too_cautious) << words.headline;
}

TEST(Audit, NamesTheCauseThatIsCommonerThanItWasGiven) {
    DrawnSeries drawn = series(4000);
    drawn.shares = {0.4, 0.4, 0.2};
    const AuditWords words = words_of(audited(drawn));
    EXPECT_EQ(words.verdict, AuditVerdict::shifted) << words.headline;
    EXPECT_TRUE(says(joined(words.remarks), "Commoner than its probabilities said: Southern fever (given"))
        << joined(words.remarks);
    EXPECT_TRUE(says(joined(words.remarks), "Rarer than its probabilities said: Northern fever"));
}

TEST(Audit, SaysForWhichCausesThereAreTooFew) {
    DrawnSeries drawn = series(400);
    drawn.shares = {0.7, 0.29, 0.01};
    const AuditWords words = words_of(audited(drawn));
    EXPECT_FALSE(words.causes[2].told);
    EXPECT_TRUE(says(joined(words.remarks), "Too few to tell: Western fever (")) << joined(words.remarks);
    EXPECT_TRUE(says(joined(words.remarks), "at least 10 patients with the cause"));

    const AuditWords few = words_of(audited(series(12)));
    EXPECT_EQ(few.verdict, AuditVerdict::too_few);
    EXPECT_TRUE(says(few.headline, "cannot be told from 12 patients")) << few.headline;
}

TEST(Audit, OfOneCauseOnlyHasNothingToTellApart) {
    DrawnSeries drawn = series(50);
    drawn.shares = {1.0, 0.0, 0.0};
    const Audit audit = audited(drawn);
    const AuditWords words = words_of(audit);
    EXPECT_EQ(words.verdict, AuditVerdict::too_few);
    EXPECT_TRUE(says(joined(words.remarks), "All patients have one final cause"));
    const auto json = audit_json(audit);
    EXPECT_TRUE(json["figures"]["scores"]["log_skill"]["value"].is_null());
    EXPECT_TRUE(json["figures"]["hand_till"].is_null());
    EXPECT_FALSE(says(audit_text(audit, false), "nan"));
    EXPECT_FALSE(says(audit_csv(audit), "nan"));
}

TEST(Audit, OfNobodyStillCounts) {
    DrawnSeries drawn = series(30);
    drawn.undiagnosed = 1.0;
    const Audit audit = audited(drawn);
    EXPECT_FALSE(audit.figures.has_value());
    EXPECT_EQ(words_of(audit).verdict, AuditVerdict::nobody);
    EXPECT_TRUE(says(audit_text(audit, false), "no patient here has a final cause among those weighed"));
    EXPECT_TRUE(audit_json(audit)["figures"].is_null());
    EXPECT_EQ(audit_json(audit)["flow"]["undiagnosed"], 30);
    const Audit empty = audited(series(0));
    EXPECT_EQ(words_of(empty).verdict, AuditVerdict::nobody);
    EXPECT_TRUE(says(audit_text(empty, false), "Audit of 0 patients"));
}

TEST(Audit, SpeaksOfThoseWithoutADiagnosis) {
    DrawnSeries drawn = series(300);
    EXPECT_TRUE(says(joined(words_of(audited(drawn)).limits), "Every patient here has a final cause"));
    drawn.undiagnosed = 0.2;
    EXPECT_TRUE(says(joined(words_of(audited(drawn)).limits), "verification bias"));
    const Tally fewer = drawn_tally(tables(), drawn).suppressed(5);
    EXPECT_TRUE(says(joined(words_of(audit_of(fewer, tables(), ward(), quickly())).limits),
                     "were dropped before this audit, because fewer than 5"));
}

TEST(Audit, FlagsPatientsWhoseCauseIsNotListedAsOneCaseWouldBe) {
    DrawnSeries drawn = series(600);
    drawn.missing = 0.3;
    drawn.outside = 0.2;
    const Tally tally = drawn_tally(tables(), drawn);
    const Audit audit = audit_of(tally, tables(), ward(), quickly());
    EXPECT_TRUE(audit.fit.exact);
    ASSERT_EQ(audit.fit.causes.size(), 1U);
    EXPECT_EQ(audit.fit.causes[0].cause, "sea_sickness");
    EXPECT_EQ(audit.fit.causes[0].patients, audit.patients.outside);
    EXPECT_EQ(audit.fit.inside.judged, audit.patients.diagnosed);
    ASSERT_TRUE(audit.fit.area.has_value());
    EXPECT_GT(audit.fit.area->value, 0.5);
    EXPECT_TRUE(says(audit_text(audit, false), "sea_sickness"));
}

TEST(Audit, ComparesTwoPriorSetsInPairsAndSaysWhichIsBetter) {
    DrawnSeries drawn = series(1500);
    const Tally tally = drawn_tally(tables(), drawn);
    priors::PriorSet wrong = ward();
    wrong.title = "Upside down";
    wrong.digest = "sha256:other";
    wrong.causes[0].probability = 0.1;
    wrong.causes[1].probability = 0.2;
    wrong.causes[2].probability = 0.7;
    const Audit better = audit_of(tally, tables(), ward(), quickly(), AuditAgainst{nullptr, &wrong});
    EXPECT_TRUE(says(words_of(better).comparison,
                     R"("Harbour ward" gave these patients better probabilities than "Upside down")"))
        << words_of(better).comparison;
    EXPECT_LT(better.against->difference.log_score.difference, 0.0);
    const Audit worse = audit_of(tally, tables(), wrong, quickly(), AuditAgainst{nullptr, &ward()});
    EXPECT_TRUE(says(words_of(worse).comparison, R"("Harbour ward" gave these patients better)"));
    const Audit same = audit_of(tally, tables(), ward(), quickly(), AuditAgainst{nullptr, &ward()});
    EXPECT_TRUE(says(words_of(same).comparison, "it cannot be told whether")) << words_of(same).comparison;
    EXPECT_EQ(same.against->difference.log_score.difference, 0.0);
}

TEST(Audit, KeepsStrataAndMonthsApart) {
    DrawnSeries drawn = series(900);
    drawn.strata = {"north wing", "south wing"};
    drawn.months = {"2025-01", "2025-02", "2025-04"};
    const Audit audit = audited(drawn);
    ASSERT_EQ(audit.strata.size(), 2U);
    EXPECT_EQ(audit.strata[0].patients.diagnosed + audit.strata[1].patients.diagnosed, 900U);
    ASSERT_TRUE(audit.months.has_value());
    EXPECT_EQ(audit.months->months, (std::vector<std::string>{"2025-01", "2025-02", "2025-03", "2025-04"}));
    EXPECT_FALSE(audit.months->chart.periods[2].log_score.has_value());
    const std::string text = audit_text(audit, false);
    EXPECT_TRUE(says(text, "By ward")) << text;
    EXPECT_TRUE(says(text, "2025-03"));
}

TEST(Audit, SuggestsTheDependenceThatThePatientsShow) {
    // Two findings that are one and the same: together they must count as one.
    likelihoods::TableSet set = tables();
    set.groups.push_back({"twins", {"thirst", "tremor"}, {0, 1}, 0.2, {}, ""});
    set.tables[1].rows = set.tables[0].rows;
    DrawnSeries drawn = series(3000);
    drawn.missing = 0.0;
    Tally twins(tally_head(set, {}, false));
    drawn_tally(set, drawn).for_each([&](const TallyCell& cell) {
        std::string code(cell.code);
        code[1] = code[0];
        twins.add(code, cell.gate, cell.cause, {}, {}, cell.patients);
    });
    AuditAsked asked = quickly();
    asked.dependence = true;
    const Audit audit = audit_of(twins, set, ward(), asked);
    ASSERT_EQ(audit.groups.size(), 1U);
    EXPECT_EQ(audit.groups[0].patients, 3000U);
    ASSERT_TRUE(audit.groups[0].fitted.has_value());
    EXPECT_GT(audit.groups[0].fitted->rho, 0.8);
    const std::string yaml = groups_yaml(audit);
    EXPECT_TRUE(says(yaml, "  - name: \"twins\"\n    findings: [thirst, tremor]\n    rho: ")) << yaml;
    EXPECT_TRUE(says(audit_text(audit, false), "a suggestion"));

    // What is suggested can be pasted into set.yaml as it is.
    std::vector<document::NamedText> files;
    for (const auto& entry : std::filesystem::directory_iterator(winds)) {
        files.emplace_back(entry.path().filename().string(), test::text_of(entry.path()));
        std::string& text = files.back().second;
        if (files.back().first == "set.yaml") {
            const std::size_t sources = yaml.find("sources:\n");
            text.insert(text.find("gate:"), yaml.substr(0, sources));
            text.insert(text.find("sources:\n") + 9, yaml.substr(sources + 9));
        }
    }
    const likelihoods::TableSet pasted = likelihoods::read_table_set(files, "pasted");
    ASSERT_EQ(pasted.groups.size(), 1U);
    EXPECT_NEAR(pasted.groups[0].rho, audit.groups[0].fitted->rho, 0.006);
    EXPECT_TRUE(says(pasted.groups[0].why, "audited patients"));
}

TEST(Audit, IsTheSameForAnyNumberOfThreadsAndAnySplit) {
    DrawnSeries drawn = series(700);
    drawn.outside = 0.05;
    drawn.undiagnosed = 0.05;
    drawn.strata = {"a", "b"};
    drawn.months = {"2025-01", "2025-02"};
    AuditAsked asked = quickly();
    asked.dependence = true;
    const Tally whole = drawn_tally(tables(), drawn);
    const std::string expected = dumped(audit_json(audit_of(whole, tables(), ward(), asked)));
    test::DrawnPatients patients(tables(), drawn);
    for (const int parts : {2, 7, 16}) {
        std::vector<Tally> split(static_cast<std::size_t>(parts), Tally(whole.head()));
        for (std::uint64_t patient = 0; patient < drawn.patients; ++patient) {
            patients.add(split[patient * 13 % split.size()], patient);
        }
        for (std::size_t part = 1; part < split.size(); ++part) {
            split[0].merge(split[part]);
        }
        asked.threads = parts / 2;
        EXPECT_EQ(dumped(audit_json(audit_of(split[0], tables(), ward(), asked))), expected) << parts;
    }
}

TEST(Audit, RefusesATallyOfOtherBands) {
    const likelihoods::TableSet other = likelihoods::load_table_set(STEELYARD_TEST_DIR "/data/tables/small");
    const Tally tally(tally_head(other, {}, false));
    EXPECT_THROW(audit_of(tally, tables(), ward(), quickly()), TallyError);
}

TEST(Audit, KeepsItsLinesToThePage) {
    DrawnSeries drawn = series(300);
    drawn.outside = 0.1;
    drawn.undiagnosed = 0.1;
    drawn.strata = {"a ward with a very long name indeed, too long for its column", "b"};
    drawn.months = {"2025-01"};
    AuditAsked asked = quickly();
    asked.cause = "west";
    asked.thresholds = {0.1};
    asked.dependence = true;
    const Audit audit =
        audit_of(drawn_tally(tables(), drawn), tables(), ward(), asked, AuditAgainst{nullptr, &ward()});
    std::istringstream lines(audit_text(audit, false));
    for (std::string line; std::getline(lines, line);) {
        EXPECT_LE(text_width(line), page_width) << line;
        EXPECT_FALSE(line.ends_with(' ')) << line;
    }
}

TEST(Audit, HoldsItsSchema) {
    const WorkDir dir;
    likelihoods::TableSet set = tables();
    set.groups.push_back({"pair", {"thirst", "tremor"}, {0, 1}, 0.2, {}, ""});
    AuditAsked asked = quickly();
    asked.dependence = true;
    asked.cause = "west";
    asked.thresholds = {0.1};
    DrawnSeries drawn = series(400);
    drawn.outside = 0.1;
    drawn.undiagnosed = 0.1;
    drawn.strata = {"a", "b"};
    drawn.months = {"2025-01", "2025-03"};
    Tally full = drawn_tally(set, drawn);
    full.add({}, likelihoods::GateStatus::out_of_scope, "gout", {}, {}, 3);
    drawn.shares = {1.0, 0.0, 0.0};
    const Tally one_cause = drawn_tally(set, drawn);
    drawn.undiagnosed = 1.0;
    const Tally nobody = drawn_tally(set, drawn);
    std::string files;
    int number = 0;
    for (const Tally& tally : {full, full.suppressed(4), one_cause, nobody, Tally(full.head())}) {
        const Audit audit = audit_of(tally, set, ward(), asked, AuditAgainst{nullptr, &ward()});
        const std::string name = std::to_string(++number);
        files += ' ' + dir.write(name + ".json", dumped(audit_json(audit), 1));
        files += ' ' + dir.write(name + ".tally", tally_text(tally));
    }
    const std::string command =
        "/usr/bin/python3 " STEELYARD_SOURCE_DIR "/tests/cli/check_audits.py " STEELYARD_SOURCE_DIR + files;
    EXPECT_EQ(std::system(command.c_str()), 0);  // NOLINT(concurrency-mt-unsafe)
}

class AuditCommandLine : public ::testing::Test {
  protected:
    std::string saved(const Tally& tally, const std::string& name) const {
        save_tally(tally, dir_.file(name));
        return dir_.file(name);
    }
    test::Outcome audit(std::vector<std::string> arguments) const {
        for (const char* word :
             {"--tables", winds.c_str(), "--priors", harbour.c_str(), "--replicates", "50"}) {
            arguments.emplace_back(word);
        }
        arguments.insert(arguments.begin(), "audit");
        return run(arguments);
    }
    WorkDir dir_;
};

TEST_F(AuditCommandLine, AuditsTalliesAddedUp) {
    DrawnSeries drawn = series(200);
    const std::string a = saved(drawn_tally(tables(), drawn), "a.tally");
    drawn.seed = 2;
    const std::string b = saved(drawn_tally(tables(), drawn), "b.tally");
    const test::Outcome both = audit({a, b, "--keep-tally", dir_.file("c.tally")});
    EXPECT_EQ(both.code, 0) << both.err;
    EXPECT_TRUE(says(both.out, "Audit of 400 patients"));
    EXPECT_EQ(audit({dir_.file("c.tally")}).out, both.out);
    EXPECT_EQ(audit({b, a}).out, both.out);
    EXPECT_EQ(audit({a, b, "--threads", "5"}).out, both.out);
}

TEST_F(AuditCommandLine, WritesCsvJsonAndGroupsWholeOrNotAtAll) {
    DrawnSeries drawn = series(300);
    const std::string a = saved(drawn_tally(tables(), drawn), "a.tally");
    const test::Outcome csv = audit({a, "--as", "csv", "--out", dir_.file("a.csv")});
    EXPECT_EQ(csv.code, 0) << csv.err;
    EXPECT_EQ(csv.out, "");
    const std::string table = test::text_of(dir_.file("a.csv"));
    EXPECT_TRUE(table.starts_with(
        "table,stratum,cause,item,quantity,value,low,high,patients\nflow,,,,read,300,,,\n"));
    std::istringstream lines(table);
    for (std::string line; std::getline(lines, line);) {
        EXPECT_EQ(std::count(line.begin(), line.end(), ','), 8) << line;
    }
    const test::Outcome json = audit({a, "--as", "json"});
    EXPECT_EQ(nlohmann::json::parse(json.out)["format"], "steelyard.audit/1");
    const test::Outcome groups = audit({a, "--write-groups", dir_.file("groups.yaml")});
    EXPECT_EQ(groups.code, 0);
    EXPECT_TRUE(says(groups.err, "no group gives reason to change its rho"));
    EXPECT_FALSE(std::filesystem::exists(dir_.file("groups.yaml")));
}

TEST_F(AuditCommandLine, KeepsATallyWithoutSmallCells) {
    const std::string a = saved(drawn_tally(tables(), series(300)), "a.tally");
    const test::Outcome kept = audit({a, "--keep-tally", dir_.file("b.tally"), "--least-cell", "5"});
    EXPECT_EQ(kept.code, 0) << kept.err;
    EXPECT_TRUE(says(kept.out, "Audit of 300 patients"));  // the audit itself is of all
    const test::Outcome again = audit({dir_.file("b.tally")});
    EXPECT_TRUE(says(again.out, "dropped: fewer than 5 in their cell")) << again.out;
}

TEST_F(AuditCommandLine, GivesExitCode4WhenNobodyCanBeScored) {
    DrawnSeries drawn = series(20);
    drawn.undiagnosed = 1.0;
    const test::Outcome result = audit({saved(drawn_tally(tables(), drawn), "a.tally")});
    EXPECT_EQ(result.code, 4);
    EXPECT_TRUE(says(result.out, "without a final cause"));
}

TEST_F(AuditCommandLine, TellsEachMistake) {
    const Tally tally = drawn_tally(tables(), series(50));
    const std::string a = saved(tally, "a.tally");
    const auto refused = [&](std::vector<std::string> arguments, int code, const std::string& part) {
        const test::Outcome result = audit(std::move(arguments));
        EXPECT_EQ(result.code, code) << result.err;
        EXPECT_TRUE(says(result.err, part)) << part << "\n" << result.err;
        EXPECT_EQ(result.out, "");
    };
    refused({}, 2, "files is required");
    refused({dir_.file("none.tally")}, 3, "unreadable-file");
    refused({dir_.write("empty.tally", "")}, 3, "empty-document");
    refused({dir_.write("notes.tally", "notes\n")}, 3, "neither a file of many cases nor a tally");
    refused({a, "--by", "ward"}, 3, "it keeps no strata");
    refused({a, "--over", "date"}, 3, "it keeps no months");
    refused({a, "--threshold", "0.2"}, 2, "--threshold needs --cause");
    refused({a, "--cause", "noth"}, 2, "did you mean north?");
    refused({a, "--cause", "north", "--threshold", "1"}, 2, "--threshold 1: must be a fraction");
    refused({a, "--level", "95"}, 2, "--level 95: must be a fraction");
    refused({a, "--bins", "1"}, 2, "--bins 1: must be");
    refused({a, "--least-cell", "5"}, 2, "--least-cell needs --keep-tally");
    refused({a, "--exclude", "north", "--exclude", "south"}, 2, "fewer than two causes");
    refused({a, "--against", "even"}, 3, "unknown-cause");
    refused({a, "--against", "adult"}, 2, "read other bands");
    refused({a, "--as", "html"}, 2, "--as");
    const test::Outcome other = run({"audit", a});
    EXPECT_EQ(other.code, 3);
    EXPECT_TRUE(says(other.err, "tally-mismatch")) << other.err;
    TallyHead head = tally.head();
    head.by = {"ward"};
    refused({a, saved(Tally(head), "b.tally")}, 3, "kept by different columns (none and ward)");
}

TEST_F(AuditCommandLine, ComparesOnlyTheSameCauses) {
    const std::string a = saved(drawn_tally(tables(), series(100)), "a.tally");
    const std::string two = dir_.write("two.yaml",
                                       "format: steelyard.prior-set/1\ntitle: Two\ngiven_as: weights\n"
                                       "causes: {north: {weight: 1}, south: {weight: 1}}\n");
    const test::Outcome refused = audit({a, "--against", two});
    EXPECT_EQ(refused.code, 2);
    EXPECT_TRUE(says(test::in_one_line(refused.err), "only one of them weighs: west")) << refused.err;
    const test::Outcome without = audit({a, "--against", two, "--exclude", "west"});
    EXPECT_EQ(without.code, 0) << without.err;
    EXPECT_TRUE(says(without.out, "Which is better?"));
    EXPECT_TRUE(says(without.out, "west"));  // now a final cause that was not weighed
}

}  // namespace
}  // namespace steelyard::cli
