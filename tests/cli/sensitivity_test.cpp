// SPDX-License-Identifier: Apache-2.0
// How sure an answer is, as the built program tells it: every "what if" is checked by weighing that other
// case.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <nlohmann/json.hpp>
#include <sstream>

#include "larkmoor_cases.hpp"
#include "progress.hpp"
#include "run_program.hpp"
#include "steelyard/engine/distributions.hpp"

namespace steelyard::test {
namespace {

using Json = nlohmann::json;

constexpr double exact = 1e-12;

const std::string case_text = R"(case: larkmoor-901
sex: male
age: 58 a
serum: {sodium: 139 mmol/L, potassium: 5.6 mmol/L, chloride: 113 mmol/L, bicarbonate: 16 mmol/L, albumin: 40 g/L, creatinine: 140 umol/L}
arterial: {ph: 7.31, pco2: 32 mmHg}
urine: {ph: 5.8, sodium: 60 mmol/L, potassium: 32 mmol/L, chloride: 62 mmol/L}
observed: {nephrocalcinosis: absent, diabetes: present}
)";

Json report_of(const std::vector<std::string>& arguments, const std::string& input = case_text) {
    std::vector<std::string> words = {"weigh", "--as", "json"};
    words.insert(words.end(), arguments.begin(), arguments.end());
    if (std::find(words.begin(), words.end(), "--draws") == words.end()) {
        words.insert(words.end(), {"--draws", "1000"});  // enough where intervals are not looked at
    }
    if (!input.empty()) {
        words.emplace_back("-");
    }
    const Outcome outcome = run(words, input);
    EXPECT_EQ(outcome.code, 0) << outcome.err;
    return Json::parse(outcome.out).at(0);
}

double posterior(const Json& report, const std::string& cause) {
    for (const Json& entry : report["causes"]) {
        if (entry["id"] == cause) {
            return entry["posterior"];
        }
    }
    throw std::runtime_error("no cause " + cause);
}

std::string leader(const Json& report) {
    const Json& causes = report["causes"];
    return std::max_element(causes.begin(), causes.end(),
                            [](const Json& a, const Json& b) {
                                return a["posterior"].get<double>() < b["posterior"].get<double>();
                            })
        ->at("id");
}

void expect_same_posterior(const Json& told, const Json& report, const std::string& what) {
    for (const auto& [cause, value] : told.items()) {
        EXPECT_NEAR(value.get<double>(), posterior(report, cause), exact) << what << ", " << cause;
    }
}

std::string replaced(const std::string& text, const std::string& from, const std::string& to) {
    const std::size_t at = text.find(from);
    EXPECT_NE(at, std::string::npos) << from;
    return std::string(text).replace(at, from.size(), to);
}

double entropy(const Json& posterior) {
    double bits = 0.0;
    for (const auto& [cause, p] : posterior.items()) {
        bits -= p.get<double>() > 0.0 ? p.get<double>() * std::log2(p.get<double>()) : 0.0;
    }
    return bits;
}

Json as_object(const Json& causes) {
    Json object = Json::object();
    for (const Json& cause : causes) {
        object[cause["id"].get<std::string>()] = cause["posterior"];
    }
    return object;
}

/// A prior set with these weights.
std::string prior_set(const std::map<std::string, double>& weights) {
    std::ostringstream text;
    text.precision(17);
    text << "format: steelyard.prior-set/1\ntitle: A set of a test\ngiven_as: weights\ncauses:\n";
    for (const auto& [cause, weight] : weights) {
        text << "  " << cause << ": {weight: " << weight << ", basis: elicited, source: us}\n";
    }
    text << "sources: {us: judgement of a test}\n";
    return text.str();
}

/// The priors of a report with one cause moved to a probability, the others in proportion.
std::map<std::string, double> moved(const Json& report, const std::string& cause, double prior) {
    std::map<std::string, double> weights;
    double old = 0.0;
    for (const Json& entry : report["causes"]) {
        weights[entry["id"]] = entry["prior"];
        old = entry["id"] == cause ? entry["prior"].get<double>() : old;
    }
    for (auto& [id, weight] : weights) {
        weight = id == cause ? prior : weight * (1.0 - prior) / (1.0 - old);
    }
    return weights;
}

TEST(Sensitivity, IntervalsHoldThePosteriorAndAreKnownWellEnough) {
    const Outcome outcome = run({"weigh", "--as", "json", "-"}, case_text);
    ASSERT_EQ(outcome.code, 0) << outcome.err;
    const Json report = Json::parse(outcome.out).at(0);
    double leads = 0.0;
    for (const Json& cause : report["causes"]) {
        EXPECT_LE(cause["low"].get<double>(), cause["posterior"].get<double>());
        EXPECT_GE(cause["high"].get<double>(), cause["posterior"].get<double>());
        EXPECT_LE(cause["low_error"].get<double>(), 0.005);
        EXPECT_LE(cause["high_error"].get<double>(), 0.005);
        leads += cause["leads"].get<double>();
    }
    EXPECT_NEAR(leads, 1.0, exact);
    EXPECT_EQ(report["provenance"]["seed"], 1);
    EXPECT_GE(report["provenance"]["draws"].get<int>(), 16384);
}

TEST(Sensitivity, TheReportIsTheSameForAnyNumberOfThreadsAndOnASecondRun) {
    const Json one = report_of({"--threads", "1", "--draws", "5000"});
    EXPECT_EQ(one, report_of({"--threads", "2", "--draws", "5000"}));
    EXPECT_EQ(one, report_of({"--threads", "7", "--draws", "5000"}));
    EXPECT_EQ(one, report_of({"--threads", "1", "--draws", "5000"}));
    EXPECT_NE(one, report_of({"--threads", "1", "--draws", "5000", "--seed", "2"}));
    EXPECT_EQ(one["provenance"]["draws"], 5000);
}

TEST(Sensitivity, TippingPriorsPutBackGiveATie) {
    const Json report = report_of({});
    const std::string first = leader(report);
    const WorkDir dir;
    ASSERT_EQ(report["sensitivity"]["tipping_priors"].size(), report["causes"].size() - 1);
    for (const Json& tipping : report["sensitivity"]["tipping_priors"]) {
        const double prior = tipping["prior"];
        if (prior > 0.999) {
            continue;  // written as a fraction it has too few digits to be put back
        }
        const std::string rival = tipping["rival"];
        const std::string set = dir.write("tip.yaml", prior_set(moved(report, rival, prior)));
        const Json tied = report_of({"--priors", set});
        EXPECT_NEAR(posterior(tied, rival), posterior(tied, first), exact) << rival;
        EXPECT_NEAR(tipping["odds_factor"].get<double>(), posterior(report, first) / posterior(report, rival),
                    1e-9 * tipping["odds_factor"].get<double>());
    }
}

TEST(Sensitivity, ThePriorForAPosteriorPutBackGivesIt) {
    const Json report = report_of({"--until", "0.97"});
    const Json& until = report["sensitivity"]["until"];
    EXPECT_EQ(until["cause"], leader(report));
    const WorkDir dir;
    const std::string set = dir.write("until.yaml", prior_set(moved(report, until["cause"], until["prior"])));
    EXPECT_NEAR(posterior(report_of({"--priors", set}), until["cause"]), 0.97, 1e-10);
}

TEST(Sensitivity, SweepsAreWhatThosePriorsGive) {
    const Json report = report_of({});
    const WorkDir dir;
    for (const Json& sweep : report["sensitivity"]["sweeps"]) {
        const Json& point = sweep["points"][4];
        const std::string set =
            dir.write("sweep.yaml", prior_set(moved(report, sweep["cause"], point["prior"])));
        expect_same_posterior(point["posterior"], report_of({"--priors", set}), sweep["cause"]);
    }
}

TEST(Sensitivity, WithoutAFindingIsTheCaseWithoutIt) {
    const Json report = report_of({});
    const std::map<std::string, std::string> cases = {
        {"nephrocalcinosis", replaced(case_text, "nephrocalcinosis: absent, ", "")},
        {"diabetes", replaced(case_text, ", diabetes: present", "")},
        {"urine_ph", replaced(case_text, "ph: 5.8, ", "")}};
    for (const auto& [finding, text] : cases) {
        const Json& list = report["sensitivity"]["without"];
        const auto told = std::find_if(list.begin(), list.end(), [&, name = finding](const Json& entry) {
            return entry["finding"] == name;
        });
        ASSERT_NE(told, list.end()) << finding;
        expect_same_posterior((*told)["posterior"], report_of({}, text), "without " + finding);
    }
}

/// A finding of an alternative that was not read comes in when the preferred one goes.
TEST(Sensitivity, WithoutAPreferredFindingItsAlternativeIsRead) {
    const std::string both =
        replaced(case_text, "chloride: 62 mmol/L}", "chloride: 62 mmol/L, ammonium: 15 mmol/d}");
    const Outcome refused = run({"weigh", "-"}, both);
    const std::string text =
        refused.code == 0
            ? both
            : replaced(case_text, "observed:", "derived: {urine_osmolal_gap: 80 mosm/kg}\nobserved:");
    const Json report = report_of({}, text);
    for (const Json& entry : report["sensitivity"]["without"]) {
        if (entry["finding"] == "urine_ammonium" || entry["finding"] == "urine_osmolal_gap") {
            expect_same_posterior(entry["posterior"], report_of({}),
                                  "without the preferred estimate of ammonium");
            return;
        }
    }
    ADD_FAILURE() << "neither estimate of ammonium was read";
}

TEST(Sensitivity, AFindingToComeIsWorthWhatWeighingItGives) {
    const Json report = report_of({});
    const Json now = as_object(report["causes"]);
    int checked = 0;
    for (const Json& next : report["next"]) {
        double left = 0.0;
        double sum = 0.0;
        for (const Json& band : next["after"]) {
            sum += band["probability"].get<double>();
            left += band["probability"].get<double>() * entropy(band["posterior"]);
        }
        EXPECT_NEAR(sum, 1.0, 1e-9) << next["finding"];
        EXPECT_NEAR(next["bits"].get<double>(), std::max(0.0, entropy(now) - left), 1e-9) << next["finding"];
        for (const Json& band : next["after"]) {
            const std::string level = band["band"];
            // A monoclonal protein bars the anion gap; conditions are not checked again (docs/method.md).
            const bool bars_another = next["finding"] == "paraprotein";
            if ((level == "present" || level == "absent") && !bars_another) {
                const std::string text =
                    replaced(case_text, "observed: {",
                             "observed: {" + next["finding"].get<std::string>() + ": " + level + ", ");
                expect_same_posterior(band["posterior"], report_of({}, text), next["finding"]);
                ++checked;
            }
        }
    }
    EXPECT_GE(checked, 10);
    // A quantity in a dependent group: the weights of the others change with it.
    const Json& list = report["next"];
    const auto excretion = std::find_if(list.begin(), list.end(),
                                        [](const Json& next) { return next["finding"] == "fe_potassium"; });
    ASSERT_NE(excretion, list.end());
    const std::string text = replaced(case_text, "observed:", "derived: {fe_potassium: 5 %}\nobserved:");
    expect_same_posterior((*excretion)["after"][0]["posterior"], report_of({}, text), "fe_potassium");
}

TEST(Sensitivity, TheBestPairIsNoWorseThanEitherAndThePlanNoWorseThanThePair) {
    const Json report = report_of({});
    const Json& pair = report["next_pair"]["together"];
    for (const Json& next : report["next"]) {
        if (next["finding"] == pair["findings"][0] || next["finding"] == pair["findings"][1]) {
            EXPECT_GE(pair["bits"].get<double>() + exact, next["bits"].get<double>());
        }
    }
    EXPECT_GE(report["next_pair"]["in_turn"]["bits"].get<double>() + exact, pair["bits"].get<double>());
}

TEST(Sensitivity, ValuesPastTheirEdgeAreWhatThatCaseGives) {
    const Json report = report_of({});
    bool found = false;
    for (const Json& edge : report["sensitivity"]["edges"]) {
        EXPECT_NEAR(edge["edge"].get<double>() - edge["value"].get<double>(), edge["distance"].get<double>(),
                    1e-9);
        EXPECT_LE(edge["chance_on_repeat"].get<double>(), 0.5);
        if (edge["finding"] == "urine_ph") {
            found = true;
            std::ostringstream ph;
            ph << edge["edge"].get<double>() + (edge["distance"].get<double>() > 0.0 ? 0.0 : -0.01);
            expect_same_posterior(edge["posterior_beyond"],
                                  report_of({}, replaced(case_text, "ph: 5.8", "ph: " + ph.str())),
                                  "urine pH");
        }
    }
    EXPECT_TRUE(found);
}

TEST(Sensitivity, ADipstickIsLessSureOfItsBand) {
    const auto chance = [](const std::string& text) {
        const Json report = report_of({}, text);
        for (const Json& edge : report["sensitivity"]["edges"]) {
            if (edge["finding"] == "urine_ph") {
                return edge["chance_on_repeat"].get<double>();
            }
        }
        throw std::runtime_error("urine pH was not read");
    };
    EXPECT_GT(chance(replaced(case_text, "ph: 5.8,", "ph: 5.8, method: dipstick,")),
              chance(replaced(case_text, "ph: 5.8,", "ph: 5.8, method: electrode,")));
}

TEST(Sensitivity, RangesHoldTheStatedPriorsAndWidenWithEpsilon) {
    const Json narrow = report_of({"--epsilon", "0"});
    const Json wide = report_of({"--epsilon", "0.2"});
    const Json all = report_of({"--epsilon", "1"});
    for (std::size_t k = 0; k < narrow["causes"].size(); ++k) {
        const double stated = narrow["causes"][k]["posterior"];
        const Json& range = narrow["sensitivity"]["range"][k];
        EXPECT_LE(range["low"].get<double>(), stated + exact);
        EXPECT_GE(range["high"].get<double>(), stated - exact);
        const auto end = [k](const Json& report, const char* which) {
            return report["sensitivity"]["contamination"]["range"][k][which].get<double>();
        };
        EXPECT_NEAR(end(narrow, "low"), stated, exact);
        EXPECT_NEAR(end(narrow, "high"), stated, exact);
        EXPECT_LE(end(wide, "low"), stated);
        EXPECT_GE(end(wide, "high"), stated);
        EXPECT_NEAR(end(all, "low"), 0.0, exact);
        EXPECT_NEAR(end(all, "high"), 1.0, exact);
    }
}

/// The factor, with the finding's weight, is the posterior odds of leader and rival.
TEST(Sensitivity, ARowsFactorMakesUpForTheOdds) {
    const Json report = report_of({});
    const std::string first = leader(report);
    std::map<std::string, double> weight;
    for (const Json& entry : report["ledger"]) {
        weight[entry["finding"]] = entry["used"].get<bool>() ? entry["weight"].get<double>() : 0.0;
    }
    ASSERT_FALSE(report["sensitivity"]["rows"].empty());
    int inside = 0;
    for (const Json& row : report["sensitivity"]["rows"]) {
        const double factor = row["factor"].is_null() ? HUGE_VAL : row["factor"].get<double>();
        const double odds = posterior(report, first) / posterior(report, row["rival"]);
        const bool of_leader = row["cause"] == first;
        const double moved = std::pow(factor, weight[row["finding"]]);
        EXPECT_NEAR(std::log(of_leader ? 1.0 / moved : moved), std::log(odds), 1e-9) << row;
        EXPECT_EQ(row["cause"] == row["rival"], !of_leader) << row;
        inside += row["within_interval"].get<bool>() ? 1 : 0;
        EXPECT_LE(row["interval"][0].get<double>(), 1.0);
        EXPECT_GE(row["interval"][1].get<double>(), 1.0);
        // Rows far out are outside, and a row whose interval holds the factor is inside.
        EXPECT_EQ(row["within_interval"].get<bool>(),
                  row["interval"][0].get<double>() <= factor && factor <= row["interval"][1].get<double>());
    }
    EXPECT_LT(inside, static_cast<int>(report["sensitivity"]["rows"].size()));
}

TEST(Sensitivity, SharesOfTheVarianceAreSharesUpToTheirError) {
    const Json report = report_of({});
    ASSERT_FALSE(report["sensitivity"]["variance"].empty());
    double first = 0.0;
    double error = 0.0;
    for (const Json& source : report["sensitivity"]["variance"]) {
        first += source["first"].get<double>();
        error += source["first_error"].get<double>();
        EXPECT_LE(source["first"].get<double>(),
                  source["total"].get<double>() +
                      4.0 * (source["first_error"].get<double>() + source["total_error"].get<double>()) +
                      0.02);
    }
    EXPECT_LE(first, 1.0 + 4.0 * error);
}

TEST(Sensitivity, BurdenLimitsWhatIsListed) {
    const Json report = report_of({"--burden", "bedside"});
    ASSERT_FALSE(report["next"].empty());
    for (const Json& next : report["next"]) {
        EXPECT_EQ(next["burden"], "bedside");
    }
    EXPECT_GT(report_of({})["next"].size(), report["next"].size());
}

TEST(Sensitivity, OddsAndCountsHaveIntervalsToo) {
    const WorkDir dir;
    const std::string odds = dir.write("odds.yaml", R"(format: steelyard.prior-set/1
title: Odds
given_as: odds_against_rest
causes:
  classic_distal: {odds: "1:3", range: ["1:6", "1:2"], basis: elicited, source: us}
  low_aldosterone: {odds: "1:1", range: ["1:2", "2:1"], basis: elicited, source: us}
  renal_failure: {odds: "1:3", basis: elicited, source: us}
sources: {us: judgement of a test}
)");
    const std::string counts = dir.write("counts.yaml", R"(format: steelyard.prior-set/1
title: Counts
given_as: counts
causes:
  classic_distal: {count: 8, basis: elicited, source: us}
  low_aldosterone: {count: 20, basis: elicited, source: us}
  renal_failure: {count: 32, basis: elicited, source: us}
sources: {us: a register of a test}
)");
    const Json of_odds = report_of({"--priors", odds});
    EXPECT_EQ(of_odds["sensitivity"]["range"].size(), 3U);
    const Json of_counts = report_of({"--priors", counts});
    EXPECT_TRUE(of_counts["sensitivity"]["range"].empty());
    for (const Json* report : {&of_odds, &of_counts}) {
        for (const Json& cause : (*report)["causes"]) {
            EXPECT_LT(cause["low"].get<double>(), cause["high"].get<double>());
        }
        const Json& variance = (*report)["sensitivity"]["variance"];
        EXPECT_TRUE(std::any_of(variance.begin(), variance.end(), [](const Json& source) {
            return source["source"] == "prior" && source["total"].get<double>() > 0.0;
        }));
    }
}

/// A set of odds in which only some state a range: the others make room. The ends, put back as priors, are
/// attained.
TEST(Sensitivity, TheRangeOfOddsIsAttainedAndDoesNotPinWhatStatesNone) {
    const WorkDir dir;
    const std::string one = dir.write("one.yaml", R"(format: steelyard.prior-set/1
title: One range
given_as: odds_against_rest
causes:
  classic_distal: {odds: "1:1", range: ["1:4", "4:1"], basis: elicited, source: us}
  low_aldosterone: {odds: "1:3", basis: elicited, source: us}
  renal_failure: {odds: "1:3", basis: elicited, source: us}
sources: {us: judgement of a test}
)");
    const Json report = report_of({"--priors", one});
    EXPECT_FALSE(report["sensitivity"]["range_narrowed"].get<bool>());
    const auto end = [&](const std::string& cause, const char* which) {
        for (const Json& range : report["sensitivity"]["range"]) {
            if (range["cause"] == cause) {
                return range[which].get<double>();
            }
        }
        throw std::runtime_error("no range");
    };
    // 1:4 is 0.2 and 4:1 is 0.8; the other two share the rest in proportion.
    for (const auto& [prior, which] : {std::pair{0.2, "low"}, std::pair{0.8, "high"}}) {
        const std::string set = dir.write("end.yaml", prior_set(moved(report, "classic_distal", prior)));
        const Json there = report_of({"--priors", set});
        EXPECT_NEAR(posterior(there, "classic_distal"), end("classic_distal", which), exact);
        EXPECT_NEAR(posterior(there, "renal_failure"), end("renal_failure", prior < 0.5 ? "high" : "low"),
                    exact);
    }
    // Three ranges of which the sum allows only a part.
    const std::string tight = dir.write("tight.yaml", R"(format: steelyard.prior-set/1
title: Three ranges
given_as: odds_against_rest
causes:
  classic_distal: {odds: "1:1", range: ["1:4", "4:1"], basis: elicited, source: us}
  low_aldosterone: {odds: "1:3", range: ["1:3.5", "1:2.5"], basis: elicited, source: us}
  renal_failure: {odds: "1:3", range: ["1:3.5", "1:2.5"], basis: elicited, source: us}
sources: {us: judgement of a test}
)");
    EXPECT_TRUE(report_of({"--priors", tight})["sensitivity"]["range_narrowed"].get<bool>());
}

/// The chance of a repeat is added up over every band in which another cause leads, not over the next band
/// alone.
TEST(Sensitivity, ARepeatIsJudgedOverAllBands) {
    const std::vector<double> edges = {5.5, 6.0, 6.5, 7.0};  // of the shipped urine_ph table
    const std::vector<std::string> inside = {"5.0", "5.7", "6.2", "6.7",
                                             "7.4"};  // a value in each of its bands
    const double value = 5.7;
    const auto with_ph = [](const std::string& ph) {
        return replaced(case_text, "ph: 5.8,", "ph: " + ph + ", method: dipstick,");
    };
    const Json report = report_of({}, with_ph("5.7"));
    const Json& list = report["sensitivity"]["edges"];
    const auto edge = std::find_if(list.begin(), list.end(),
                                   [](const Json& entry) { return entry["finding"] == "urine_ph"; });
    ASSERT_NE(edge, list.end());
    // The spread that the report used, from the chance it gives for the nearest edge.
    const double deviate = engine::normal_quantile((*edge)["chance_on_repeat"].get<double>());
    const double sd =
        -std::abs((*edge)["distance"].get<double>()) / deviate;  // of the difference of two samples
    double expected = 0.0;
    for (std::size_t band = 0; band < inside.size(); ++band) {
        if (leader(report_of({}, with_ph(inside[band]))) != leader(report)) {
            const double low = band == 0 ? 0.0 : engine::normal_lower((edges[band - 1] - value) / sd);
            const double high = band == edges.size() ? 1.0 : engine::normal_lower((edges[band] - value) / sd);
            expected += high - low;
        }
    }
    EXPECT_GT(expected, 0.0) << "the case must have a band in which another cause leads";
    EXPECT_NEAR((*edge)["chance_of_another_leader"].get<double>(), expected, 1e-6);
}

TEST(Sensitivity, TheBurdenDoesNotChangeWhatTheSentenceSays) {
    for (const std::string path : {"/docs/cases/larkmoor-018.yaml", "/docs/cases/larkmoor-003.yaml"}) {
        const std::string file = STEELYARD_SOURCE_DIR + path;
        EXPECT_EQ(report_of({file}, "")["summary"]["cheapest_change"],
                  report_of({file, "--burden", "bedside"}, "")["summary"]["cheapest_change"]);
    }
}

TEST(Sensitivity, NothingIsListedThatWouldBeSetAside) {
    // Glycosuria needs a plasma glucose, which this case does not give.
    const Json report = report_of({});
    for (const Json& next : report["next"]) {
        EXPECT_NE(next["finding"], "glycosuria");
    }
    EXPECT_TRUE(report["barred"].contains("glycosuria"));
}

TEST(Sensitivity, PriorsOfAnySizeThatIsReadAreDrawn) {
    const WorkDir dir;
    for (const std::string worth : {"1e12", "1e6", "1e-6"}) {
        const std::string set = dir.write(
            "worth.yaml",
            "format: steelyard.prior-set/1\ntitle: A worth\ngiven_as: weights\nworth: " + worth + R"(
causes:
  classic_distal: {weight: 1, basis: elicited, source: us}
  low_aldosterone: {weight: 2, basis: elicited, source: us}
sources: {us: judgement of a test}
)");
        EXPECT_EQ(report_of({"--priors", set})["causes"].size(), 2U) << worth;
    }
    const std::string counts = dir.write("counts.yaml", R"(format: steelyard.prior-set/1
title: Counts
given_as: counts
causes:
  classic_distal: {count: 100000000000, basis: elicited, source: us}
  low_aldosterone: {count: 0, basis: elicited, source: us}
sources: {us: a register of a test}
)");
    EXPECT_EQ(report_of({"--priors", counts})["causes"].size(), 2U);
}

/// Of several cases some leaders may lie above the target: those say so, the others are answered.
TEST(Sensitivity, ATargetThatSomeCasesCannotBeAskedFor) {
    const WorkDir dir;
    const std::string strong = dir.write("strong.yaml", R"(format: steelyard.prior-set/1
title: A strong prior
given_as: weights
causes:
  renal_failure: {weight: 90, basis: elicited, source: us}
  low_aldosterone: {weight: 9, basis: elicited, source: us}
  classic_distal: {weight: 1, basis: elicited, source: us}
sources: {us: judgement of a test}
)");
    const std::string plain = "case: larkmoor-904\nserum: {bicarbonate: 15 mmol/L}\n";
    const Outcome outcome = run({"weigh", "--as", "ndjson", "--draws", "1000", "--until", "0.5", "--priors",
                                 strong, "-", STEELYARD_SOURCE_DIR "/docs/cases/larkmoor-002.yaml"},
                                plain);
    ASSERT_EQ(outcome.code, 0) << outcome.err;
    std::istringstream lines(outcome.out);
    std::string line;
    std::getline(lines, line);
    EXPECT_TRUE(Json::parse(line)["sensitivity"]["until"]["prior"].is_null());
    std::getline(lines, line);
    EXPECT_FALSE(Json::parse(line)["sensitivity"]["until"]["prior"].is_null());
}

/// Nothing on the list explains a low potassium and aldosterone with the signs of potassium retention.
TEST(Sensitivity, APanelThatNoCauseExplainsSaysSoBeforeThePercentages) {
    const std::string strange = R"(case: larkmoor-902
sex: male
age: 50 a
serum: {sodium: 139 mmol/L, potassium: 2.2 mmol/L, chloride: 113 mmol/L, bicarbonate: 16 mmol/L, albumin: 40 g/L, creatinine: 700 umol/L}
arterial: {ph: 7.31, pco2: 32 mmHg}
urine: {ph: 7.6, sodium: 60 mmol/L, potassium: 32 mmol/L, chloride: 180 mmol/L}
observed: {nephrocalcinosis: present, glycosuria: present, urinary_diversion: present, paraprotein: present, gut_loss: present}
)";
    const Json report = report_of({}, strange);
    EXPECT_FALSE(report["fit"]["explained"].get<bool>());
    const Outcome text = run({"weigh", "-", "--brief"}, strange);
    const std::size_t warning = text.out.find("No cause on the list explains these findings");
    EXPECT_NE(warning, std::string::npos);
    EXPECT_LT(warning, text.out.find("How likely each cause is"));
    EXPECT_TRUE(report_of({})["fit"]["explained"].get<bool>());
}

TEST(Sensitivity, ACaseWithoutFindingsIsItsPriors) {
    const std::string empty = "case: larkmoor-903\n";
    const Json report = report_of({}, empty);
    for (const Json& cause : report["causes"]) {
        EXPECT_NEAR(cause["posterior"].get<double>(), cause["prior"].get<double>(), exact);
    }
    EXPECT_EQ(report["summary"]["separation"],
              "No finding of this case could be read: these are the prior odds alone.");
    EXPECT_TRUE(report["sensitivity"]["without"].empty());
    EXPECT_TRUE(report["sensitivity"]["edges"].empty());
    EXPECT_EQ(report["fit"]["conflict_bits"], 0.0);
    EXPECT_FALSE(report["next"].empty());
    EXPECT_EQ(run({"weigh", "-", "--full"}, empty).code, 0);
}

class Lengths : public ::testing::TestWithParam<std::string> {};

TEST_P(Lengths, AreOneScreenTwoScreensAndAll) {
    const auto lines = [](const std::string& text) { return std::count(text.begin(), text.end(), '\n'); };
    const Outcome brief = run({"weigh", GetParam(), "--brief", "--draws", "1000"});
    const Outcome ordinary = run({"weigh", GetParam(), "--draws", "1000"});
    const Outcome full = run({"weigh", GetParam(), "--full", "--draws", "1000"});
    for (const Outcome* outcome : {&brief, &ordinary, &full}) {
        EXPECT_NE(outcome->out.find("Caution: "), std::string::npos);
    }
    if (ordinary.code == 0) {
        EXPECT_LE(lines(brief.out), 60);
        EXPECT_LE(lines(ordinary.out), 120);
        EXPECT_GT(lines(ordinary.out), lines(brief.out));
        EXPECT_GT(lines(full.out), lines(ordinary.out));
    }
}

INSTANTIATE_TEST_SUITE_P(Larkmoor, Lengths, ::testing::ValuesIn(larkmoor_cases()), larkmoor_name);

struct WrongOption {
    std::vector<std::string> arguments;
    std::string told;
};

TEST(Sensitivity, AbsurdOptionsAreRefusedInWords) {
    const std::vector<WrongOption> wrong = {
        {{"--draws", "10"}, "--draws 10: must be a whole number from 1000 to 1000000"},
        {{"--draws", "1e5"}, "--draws 1e5: must be a whole number from 1000 to 1000000"},
        {{"--draws", "99999999999999999999"}, "must be a whole number from 1000 to 1000000"},
        {{"--draws", "-5"}, "must be a whole number from 1000 to 1000000"},
        {{"--seed", "-1"}, "--seed -1: must be a whole number from 0 to 2^64 - 1"},
        {{"--seed", "1.5"}, "must be a whole number from 0 to 2^64 - 1"},
        {{"--seed", "luck"}, "must be a whole number from 0 to 2^64 - 1"},
        {{"--threads", "0"}, "must be a whole number from 1 to 256"},
        {{"--epsilon", "1.2"}, "--epsilon 1.2: must be a fraction from 0 to 1"},
        {{"--epsilon", "nan"}, "must be a fraction from 0 to 1"},
        {{"--epsilon", "-0.1"}, "must be a fraction from 0 to 1"},
        {{"--until", "90"}, "--until 90: must be a fraction between 0 and 1, as 0.9 for 90 %"},
        {{"--until", "0"}, "must be a fraction between 0 and 1"},
        {{"--until", "1"}, "must be a fraction between 0 and 1"},
        {{"--until", "90%"}, "must be a fraction between 0 and 1"},
        {{"--until", "0.05"}, "not above the prior of the leading cause"},
        {{"--burden", "heavy"}, "--burden"},
        {{"--brief", "--full"}, "--brief"},
    };
    for (const WrongOption& option : wrong) {
        std::vector<std::string> words = {"weigh", "-"};
        words.insert(words.end(), option.arguments.begin(), option.arguments.end());
        const Outcome outcome = run(words, case_text);
        EXPECT_EQ(outcome.code, 2) << option.told;
        EXPECT_TRUE(outcome.out.empty()) << option.told;
        std::string told = outcome.err;
        for (std::size_t at = told.find("\n  "); at != std::string::npos; at = told.find("\n  ")) {
            told.replace(at, 3, " ");
        }
        EXPECT_NE(told.find(option.told), std::string::npos) << outcome.err;
    }
}

TEST(Progress, IsSilentAtFirstAndWithoutATerminal) {
    std::ostringstream none;
    {
        cli::Progress patient(none, true, std::chrono::hours(1));
        patient.tell("case 1 of 2", 0.5);
        cli::Progress unseen(none, false, std::chrono::milliseconds(0));
        unseen.tell("case 1 of 2", 0.5);
    }
    EXPECT_EQ(none.str(), "");
    std::ostringstream shown;
    {
        cli::Progress progress(shown, true, std::chrono::milliseconds(0));
        progress.tell("case 1 of 2", 0.5);
    }
    EXPECT_EQ(shown.str(), "\r[###############               ]  50 % case 1 of 2\x1b[K\r\x1b[K");
}

}  // namespace
}  // namespace steelyard::test
