// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <map>
#include <sstream>

#include "near.hpp"
#include "reference_table.hpp"
#include "steelyard/document/strict_map.hpp"
#include "steelyard/priors/odds.hpp"
#include "text_of.hpp"

namespace steelyard::priors {
namespace {

using document::Code;
using document::Diagnostic;
using test::faults_of;
using test::near_abs;
using test::near_rel;
using test::near_ulps;
using test::set_text;

PriorSet read(const std::string& text) {
    return read_prior_set(text, "test.yaml");
}

double sum_of(const PriorSet& set) {
    double sum = 0.0;
    for (const PriorCause& cause : set.causes) {
        sum += cause.probability;
    }
    return sum;
}

const std::string whole_set = R"(format: steelyard.prior-set/1
title: Larkmoor adult ward
note: Agreed for adults.
given_as: odds_against_rest
causes:
  classic_distal: {odds: "1:3", range: ["1:6", "1:2"], basis: elicited, source: larkmoor-2026, note: Seen often.}
  renal_failure:
    odds: 3
    range: [2, "4:1"]
    basis: review
    source: [larkmoor-2026, other]
sources:
  larkmoor-2026: Agreed by three physicians
  other: {cite: A review of wards, doi: 10.1000/1, seen: abstract}
)";

TEST(ReadPriorSet, KeepsEverythingThatTheFileSays) {
    const PriorSet set = read(whole_set);
    EXPECT_EQ(set.title, "Larkmoor adult ward");
    EXPECT_EQ(set.name, "test.yaml");
    EXPECT_EQ(set.note, "Agreed for adults.");
    EXPECT_EQ(set.given_as, GivenAs::odds_against_rest);
    EXPECT_EQ(set.ids(), (std::vector<std::string>{"classic_distal", "renal_failure"}));
    ASSERT_EQ(set.causes.size(), 2U);
    const PriorCause& first = set.causes[0];
    EXPECT_EQ(first.as_given, "1:3");
    EXPECT_EQ(first.given, 1.0 / 3.0);
    EXPECT_EQ(first.range_low, 1.0 / 6.0);
    EXPECT_EQ(first.range_high, 0.5);
    EXPECT_EQ(first.range_as_given, "1:6 to 1:2");
    EXPECT_EQ(first.note, "Seen often.");
    EXPECT_EQ(first.where, (document::SourcePosition{"test.yaml", 6, 3}));
    ASSERT_TRUE(first.grounds);
    EXPECT_EQ(first.grounds->basis, document::Basis::elicited);
    const PriorCause& second = set.causes[1];
    EXPECT_EQ(second.given, 3.0);
    EXPECT_EQ(second.range_as_given, "2 to 4:1");
    ASSERT_TRUE(second.grounds);
    EXPECT_EQ(second.grounds->sources, (std::vector<std::string>{"larkmoor-2026", "other"}));
    ASSERT_EQ(set.sources.size(), 2U);
    EXPECT_EQ(set.sources[1].seen, "abstract");
    EXPECT_TRUE(near_ulps(0.25, first.probability, 2));
    EXPECT_TRUE(near_ulps(0.75, second.probability, 2));
}

TEST(ReadPriorSet, ReadsTheSameFromJson) {
    const std::string json = R"({"format": "steelyard.prior-set/1", "title": "Larkmoor adult ward",
 "given_as": "odds_against_rest",
 "causes": {"classic_distal": {"odds": "1:3", "range": ["1:6", 0.5]}, "renal_failure": {"odds": 3}}})";
    const PriorSet set = read_prior_set(json, "test.json");
    EXPECT_EQ(set.causes[0].given, 1.0 / 3.0);
    EXPECT_EQ(set.causes[0].range_high, 0.5);
    EXPECT_EQ(set.causes[1].given, 3.0);
    EXPECT_FALSE(set.causes[0].grounds);
}

TEST(ReadPriorSet, ReadsOddsWithoutQuotes) {
    const PriorSet set = read(
        "format: steelyard.prior-set/1\ntitle: t\ngiven_as: odds_against_rest\ncauses:\n"
        "  proximal:\n    odds: 1:3\n  renal_failure: {odds: 3:1}\n");
    EXPECT_EQ(set.causes[0].given, 1.0 / 3.0);
    EXPECT_EQ(set.causes[1].given, 3.0);
}

// Expected numbers by fraction arithmetic and from a published case mix; the source stands in each row.
TEST(ReadPriorSet, AgreesWithTheReferenceTable) {
    const test::ReferenceTable table("priors.csv");
    const std::map<std::string, PriorSet> sets{
        {"odds", read(set_text(
                     "odds_against_rest", "odds",
                     {{"proximal", "\"1:3\""}, {"classic_distal", "\"1:4\""}, {"extrarenal", "\"11:9\""}}))},
        {"odds-loose",
         read(set_text("odds_against_rest", "odds", {{"proximal", "\"51:49\""}, {"extrarenal", "\"1:1\""}}))},
        {"weights", read(set_text("weights", "weight",
                                  {{"proximal", "1"}, {"classic_distal", "2"}, {"extrarenal", "5"}}))},
        {"counts", read(set_text("counts", "count",
                                 {{"classic_distal", "11"},
                                  {"voltage_distal", "12"},
                                  {"low_aldosterone", "15"},
                                  {"extrarenal", "8"}}))},
        {"counts-unseen", read(set_text("counts", "count", {{"proximal", "0"}, {"renal_failure", "9"}}))}};
    for (const auto& [name, set] : sets) {
        for (const PriorCause& cause : set.causes) {
            EXPECT_TRUE(table.matches(name, cause.id, cause.probability));
        }
    }
    EXPECT_TRUE(table.matches("odds-loose", "given_sum", sets.at("odds-loose").given_sum));
    EXPECT_TRUE(table.matches("counts", "worth", sets.at("counts").worth));
    EXPECT_TRUE(table.unused().empty()) << testing::PrintToString(table.unused());
}

TEST(ReadPriorSet, GivesACauseNeverCountedAPriorAboveZero) {
    const PriorSet set = read(set_text("counts", "count", {{"proximal", "0"}, {"renal_failure", "1000000"}}));
    EXPECT_GT(set.causes[0].probability, 0.0);
    EXPECT_TRUE(std::isfinite(set.log_prior()(0)));
}

TEST(ReadPriorSet, ReadsAWorthAndRangesUnderWeights) {
    const PriorSet set = read(
        "format: steelyard.prior-set/1\ntitle: t\ngiven_as: weights\nworth: 10\ncauses:\n"
        "  proximal: {weight: 4, range: [2, 8]}\n  renal_failure: {weight: 45, range: [45, 45]}\n");
    EXPECT_EQ(set.worth, 10.0);
    EXPECT_EQ(set.causes[0].range_low, 2.0);
    EXPECT_EQ(set.causes[1].range_high, 45.0);
    EXPECT_EQ(read(set_text("weights", "weight", {{"proximal", "4"}, {"renal_failure", "45"}})).worth, 0.0);
}

TEST(ReadPriorSet, TakesWeightsAtBothBoundsWithoutLosingACause) {
    const PriorSet set =
        read(set_text("weights", "weight", {{"proximal", "1e-12"}, {"renal_failure", "1e12"}}));
    EXPECT_GT(set.causes[0].probability, 0.0);
    EXPECT_TRUE(set.log_prior().isFinite().all());
    EXPECT_EQ(
        faults_of(set_text("weights", "weight", {{"proximal", "1e-13"}, {"renal_failure", "1e13"}})).size(),
        2U);
}

TEST(ReadPriorSet, ReportsAllFaultsInOneRun) {
    const std::vector<Diagnostic> faults = faults_of(R"(format: steelyard.prior-set/1
title: Larkmoor
given_as: odds_against_rest
worth: 10
causes:
  proximle: {odds: "1:3", basis: hearsay}
  renal_failure: {odds: "three", range: [1, 2, 3], source: nowhere}
colour: red
)",
                                                     test::shipped_causes());
    std::vector<std::string> found;
    for (const Diagnostic& fault : faults) {
        found.push_back(std::to_string(fault.where.line) + ":" + std::to_string(fault.where.column) + " " +
                        std::string(document::to_string(fault.code)));
    }
    const std::vector<std::string> wanted{"4:1 conflicting-keys", "6:3 unknown-cause", "6:34 bad-basis",
                                          "7:18 missing-key",     "7:25 bad-odds",     "7:41 bad-interval",
                                          "7:60 unknown-source",  "8:1 unknown-key"};
    EXPECT_EQ(found, wanted);
    EXPECT_EQ(faults[1].hint, "did you mean proximal?");
}

TEST(ReadPriorSet, AcceptsAnyCauseWhenNoneAreNamed) {
    EXPECT_NO_THROW(read(set_text("weights", "weight", {{"something_else", "1"}, {"another", "2"}})));
}

TEST(ReadPriorSet, SaysWhichKeyBelongsToTheForm) {
    const std::vector<Diagnostic> faults =
        faults_of(set_text("weights", "odds", {{"proximal", "\"1:3\""}, {"renal_failure", "\"3:1\""}}));
    ASSERT_EQ(faults.size(), 2U);
    EXPECT_EQ(faults[0].code, Code::conflicting_keys);
    EXPECT_EQ(
        faults[0].message,
        "causes.proximal.odds belongs to `given_as: odds_against_rest`, but this set is given as weights");
    EXPECT_EQ(faults[0].hint, "write `weight` here, or change `given_as`");
}

TEST(Coherence, AllowsAMissOfTwoInAHundredAndNoMore) {
    // 0.52 + 0.50 = 1.02 is the last sum allowed, 0.53 + 0.50 = 1.03 is not; likewise 0.98 and 0.97 below.
    const auto loads = [](const std::string& odds) {
        return faults_of(
                   set_text("odds_against_rest", "odds", {{"proximal", odds}, {"renal_failure", "\"1:1\""}}))
            .empty();
    };
    EXPECT_TRUE(loads("\"52:48\""));
    EXPECT_FALSE(loads("\"53:47\""));
    EXPECT_TRUE(loads("\"48:52\""));
    EXPECT_FALSE(loads("\"47:53\""));
}

/// The YAML that the hint of an incoherent set offers.
std::string offered(const Diagnostic& fault) {
    const std::size_t at = fault.hint.find("causes: {");
    return at == std::string::npos ? "" : fault.hint.substr(at) + "\n";
}

TEST(Coherence, PrintsTheSumAndOffersANearestSetThatLoadsWhenPasted) {
    const std::string head = "format: steelyard.prior-set/1\ntitle: t\ngiven_as: odds_against_rest\n";
    const std::string tail = "sources: {larkmoor-2026: Agreed, other-2026: Another}\n";
    const std::string text = head + R"(causes:
  proximal: {odds: "1:3", range: ["1:6", "1:2"], basis: elicited, source: larkmoor-2026}
  classic_distal: {odds: "1:1", range: ["9:10", "2:1"], basis: memory, source: [larkmoor-2026, other-2026]}
  renal_failure: {odds: "3:1", note: "Said \"often\"; a back\\slash, a tab\t and ünlaut"}
)" + tail;
    const std::vector<Diagnostic> faults = faults_of(text);
    ASSERT_EQ(faults.size(), 1U);
    EXPECT_EQ(faults[0].code, Code::incoherent_odds);
    // 0.25 + 0.5 + 0.75
    EXPECT_EQ(
        faults[0].message,
        "the odds against the rest stand for probabilities that sum to 1.5, but must sum to 1 within 0.02");
    const std::string yaml = offered(faults[0]);
    ASSERT_FALSE(yaml.empty());
    const PriorSet set = read(head + yaml + tail);
    // 1/6, 1/3, 1/2: odds 1:5, 1:2, 1:1.
    EXPECT_EQ(set.causes[0].as_given, "1:5");
    EXPECT_EQ(set.causes[1].as_given, "1:2");
    EXPECT_EQ(set.causes[2].as_given, "1:1");
    EXPECT_EQ(set.causes[0].range_as_given, "1:6 to 1:2");
    EXPECT_FALSE(set.causes[1].range_low) << "the old range does not hold the new odds";
    EXPECT_EQ(set.causes[2].note, "Said \"often\"; a back\\slash, a tab\t and ünlaut");
    ASSERT_TRUE(set.causes[1].grounds);
    EXPECT_EQ(set.causes[1].grounds->basis, document::Basis::memory);
    EXPECT_EQ(set.causes[1].grounds->sources, (std::vector<std::string>{"larkmoor-2026", "other-2026"}));
}

TEST(Coherence, OffersTheSameTextWhenPrinted) {
    const std::string text =
        set_text("odds_against_rest", "odds", {{"proximal", "\"1:1\""}, {"renal_failure", "\"3:1\""}});
    try {
        static_cast<void>(read(text));
        FAIL() << "the set is incoherent";
    } catch (const document::LoadError& error) {
        std::ostringstream printed;
        document::print(printed, error.faults());
        EXPECT_NE(
            printed.str().find(R"(causes: {proximal: {odds: "1:1.5"}, renal_failure: {odds: "1.5:1"}})"),
            std::string::npos)
            << printed.str();
    }
}

TEST(Coherence, OffersALoadableSetForAnyOdds) {
    EXPECT_TRUE(rc::check("pasted nearest set loads", [] {
        const int causes = *rc::gen::inRange(2, 9);
        std::vector<std::pair<std::string, std::string>> given;
        for (int i = 0; i < causes; ++i) {
            const double odds = std::pow(10.0, *rc::gen::inRange(-400, 401) / 100.0);
            given.emplace_back("cause_" + std::to_string(i), odds_text(odds).insert(0, "\"") + "\"");
        }
        const std::string text = set_text("odds_against_rest", "odds", given);
        const std::vector<Diagnostic> faults = faults_of(text);
        if (!faults.empty()) {
            RC_ASSERT(faults.size() == 1U);
            const std::string yaml = offered(faults.front());
            RC_ASSERT(!yaml.empty());
            RC_ASSERT(faults_of(text.substr(0, text.find("causes:")) + yaml).empty());
        }
    }));
}

TEST(ReadPriorSet, GivesTheSameProbabilitiesWhateverTheScaleOfTheWeights) {
    EXPECT_TRUE(rc::check("weights and weights times a constant", [] {
        const int causes = *rc::gen::inRange(2, 9);
        // A power of two, so that the scaled weights are exact and the probabilities must agree to the last
        // bit.
        const double scale = std::ldexp(1.0, *rc::gen::inRange(-15, 16));
        std::vector<std::pair<std::string, std::string>> given, scaled;
        for (int i = 0; i < causes; ++i) {
            const int weight = *rc::gen::inRange(1, 100'000);
            std::ostringstream text;
            text.precision(17);
            text << weight * scale;
            given.emplace_back("cause_" + std::to_string(i), std::to_string(weight));
            scaled.emplace_back("cause_" + std::to_string(i), text.str());
        }
        const PriorSet a = read(set_text("weights", "weight", given));
        const PriorSet b = read(set_text("weights", "weight", scaled));
        for (std::size_t i = 0; i < a.causes.size(); ++i) {
            RC_ASSERT(a.causes[i].probability == b.causes[i].probability);
        }
        RC_ASSERT(static_cast<bool>(near_abs(1.0, sum_of(a), causes * 2.3e-16)));
    }));
}

TEST(ReadPriorSet, ReturnsTheOddsOfACoherentSet) {
    EXPECT_TRUE(rc::check("weights -> odds -> probabilities", [] {
        const int causes = *rc::gen::inRange(2, 9);
        std::vector<std::pair<std::string, std::string>> weights, odds;
        std::vector<int> parts;
        int total = 0;
        for (int i = 0; i < causes; ++i) {
            parts.push_back(*rc::gen::inRange(1, 1000));
            total += parts.back();
        }
        for (int i = 0; i < causes; ++i) {
            const std::string id = "cause_" + std::to_string(i);
            const int part = parts[static_cast<std::size_t>(i)];
            weights.emplace_back(id, std::to_string(part));
            odds.emplace_back(id, "\"" + std::to_string(part) + ":" + std::to_string(total - part) + "\"");
        }
        const PriorSet by_weight = read(set_text("weights", "weight", weights));
        const PriorSet by_odds = read(set_text("odds_against_rest", "odds", odds));
        RC_ASSERT(static_cast<bool>(near_abs(1.0, by_odds.given_sum, causes * 4e-16)));
        for (std::size_t i = 0; i < by_odds.causes.size(); ++i) {
            const double p = by_odds.causes[i].probability;
            RC_ASSERT(static_cast<bool>(near_rel(by_weight.causes[i].probability, p, 1e-14)));
            // p / (1 - p) magnifies a relative error of p by 1 / (1 - p) <= 8000 here.
            RC_ASSERT(static_cast<bool>(near_rel(by_odds.causes[i].given, odds_of_probability(p), 1e-11)));
        }
    }));
}

TEST(ReadPriorSet, ThrowsForAFileThatIsNotThere) {
    try {
        static_cast<void>(load_prior_set(STEELYARD_TEST_DIR "/data/no-such-file.yaml"));
        FAIL() << "there is no such file";
    } catch (const document::LoadError& error) {
        EXPECT_EQ(error.faults().sorted().at(0).code, Code::unreadable_file);
    }
}

}  // namespace
}  // namespace steelyard::priors
