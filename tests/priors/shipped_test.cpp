// SPDX-License-Identifier: Apache-2.0
// The sets shipped with the program: they load, they name only known causes, and they say honestly what they
// rest on.
#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <map>
#include <set>
#include <sstream>
#include <stdexcept>

#include "near.hpp"
#include "steelyard/document/strict_map.hpp"
#include "text_of.hpp"

namespace steelyard::priors {
namespace {

using test::near_abs;
using test::near_rel;

PriorSet open(const std::string& name) {
    return open_prior_set(name, test::shipped_causes());
}

TEST(ShippedPriorSets, BeginWithTheDefault) {
    EXPECT_EQ(shipped_prior_sets(), (std::vector<std::string>{"renal-clinic", "general-ward", "even",
                                                              "renal-causes", "renal-clinic-overlap"}));
}

TEST(ShippedPriorSets, AreAllTheFilesOfTheFolder) {
    std::set<std::string> files;
    for (const auto& entry : std::filesystem::directory_iterator(STEELYARD_SOURCE_DIR "/priors/sets")) {
        files.insert(entry.path().stem().string());
    }
    const std::vector<std::string> names = shipped_prior_sets();
    EXPECT_EQ(files, std::set<std::string>(names.begin(), names.end()));
}

TEST(ShippedPriorSets, NameOnlyTheCausesOfTheEvidenceAndSumToOne) {
    for (const std::string& name : shipped_prior_sets()) {
        const PriorSet set = open(name);
        double sum = 0.0;
        for (const PriorCause& cause : set.causes) {
            sum += cause.probability;
        }
        EXPECT_TRUE(near_abs(1.0, sum, 1e-15 * static_cast<double>(set.causes.size()))) << name;
        EXPECT_FALSE(set.title.empty()) << name;
        EXPECT_FALSE(set.note.empty()) << name << " must say what setting it is for";
    }
}

TEST(ShippedPriorSets, CallEveryPriorElicited) {
    // No published distribution of adults over these causes was found, so none may pass for one.
    for (const std::string& name : shipped_prior_sets()) {
        for (const PriorCause& cause : open(name).causes) {
            ASSERT_TRUE(cause.grounds) << name << " " << cause.id;
            EXPECT_EQ(cause.grounds->basis, document::Basis::elicited) << name << " " << cause.id;
        }
    }
}

TEST(ShippedPriorSets, GiveARangeToEveryPriorThatIsAnEstimate) {
    for (const std::string& name : shipped_prior_sets()) {
        for (const PriorCause& cause : open(name).causes) {
            EXPECT_EQ(cause.range_low.has_value(), name != "even") << name << " " << cause.id;
        }
    }
}

// The shares as elicited, per hundred: a renal clinic and a general ward, worth ten patients.
TEST(ShippedPriorSets, HoldTheElicitedShares) {
    const std::map<std::string, std::map<std::string, double>> wanted{{"renal-clinic",
                                                                       {{"proximal", 4},
                                                                        {"classic_distal", 8},
                                                                        {"voltage_distal", 6},
                                                                        {"low_aldosterone", 22},
                                                                        {"renal_failure", 45},
                                                                        {"extrarenal", 15}}},
                                                                      {"general-ward",
                                                                       {{"proximal", 4},
                                                                        {"classic_distal", 6},
                                                                        {"voltage_distal", 5},
                                                                        {"low_aldosterone", 15},
                                                                        {"renal_failure", 25},
                                                                        {"extrarenal", 45}}}};
    for (const auto& [name, shares] : wanted) {
        const PriorSet set = open(name);
        EXPECT_EQ(set.worth, 10.0);
        ASSERT_EQ(set.causes.size(), shares.size());
        for (const PriorCause& cause : set.causes) {
            EXPECT_TRUE(near_rel(shares.at(cause.id) / 100.0, cause.probability, 1e-14))
                << name << " " << cause.id;
        }
    }
}

TEST(ShippedPriorSets, EvenGivesEveryCauseOneSixth) {
    for (const PriorCause& cause : open("even").causes) {
        EXPECT_TRUE(near_rel(1.0 / 6.0, cause.probability, 1e-15));
    }
}

TEST(ShippedPriorSets, RenalCausesAreTheRenalClinicWithoutExtrarenal) {
    const PriorSet renal = open("renal-causes");
    const PriorSet derived = without(open("renal-clinic"), {"extrarenal"});
    ASSERT_EQ(renal.ids(), derived.ids());
    EXPECT_TRUE(near_rel(derived.worth, renal.worth, 1e-14));
    for (std::size_t i = 0; i < renal.causes.size(); ++i) {
        EXPECT_TRUE(near_rel(derived.causes[i].probability, renal.causes[i].probability, 1e-14));
        EXPECT_EQ(derived.causes[i].range_as_given, renal.causes[i].range_as_given);
    }
}

TEST(ShippedPriorSets, OverlapTakesItsShareFromItsTwoPartsAndFromNothingElse) {
    const PriorSet overlap = open("renal-clinic-overlap");
    const PriorSet clinic = open("renal-clinic");
    const auto share = [](const PriorSet& set, const char* id) { return set.find(id)->probability; };
    for (const char* id : {"proximal", "classic_distal", "voltage_distal", "extrarenal"}) {
        EXPECT_TRUE(near_rel(share(clinic, id), share(overlap, id), 1e-14)) << id;
    }
    EXPECT_TRUE(near_rel(share(clinic, "low_aldosterone") + share(clinic, "renal_failure"),
                         share(overlap, "low_aldosterone") + share(overlap, "renal_failure") +
                             share(overlap, "low_aldosterone_renal_failure"),
                         1e-14));
    // The two published series behind its size are named: Kidney Int 1980;17:89 and Am J Nephrol 1981;1:160.
    EXPECT_NE(overlap.note.find("23 of 31 (schambelan-1980)"), std::string::npos);
    EXPECT_NE(overlap.note.find("16 of 25 (arruda-1981)"), std::string::npos);
    EXPECT_NE(document::find_source(overlap.sources, "schambelan-1980"), nullptr);
    EXPECT_NE(document::find_source(overlap.sources, "arruda-1981"), nullptr);
}

TEST(ShippedPriorSets, ListEverySourceThatANoteNames) {
    for (const std::string& name : shipped_prior_sets()) {
        const PriorSet set = open(name);
        std::string notes = set.note;
        std::set<std::string> cited;
        for (const PriorCause& cause : set.causes) {
            notes += " " + cause.note;
            cited.insert(cause.grounds->sources.begin(), cause.grounds->sources.end());
        }
        for (const document::Source& source : set.sources) {
            EXPECT_TRUE(cited.contains(source.key) || notes.find(source.key) != std::string::npos)
                << name << " lists " << source.key << ", which nothing names";
        }
        for (std::size_t at = notes.find('('); at != std::string::npos; at = notes.find('(', at + 1)) {
            const std::string inside = notes.substr(at + 1, notes.find(')', at) - at - 1);
            if (inside.find("-19") != std::string::npos || inside.find("-20") != std::string::npos) {
                EXPECT_NE(document::find_source(set.sources, inside), nullptr) << name << " names " << inside;
            }
        }
    }
}

TEST(OpenPriorSet, TakesAShippedNameWithOrWithoutItsPrefix) {
    const PriorSet plain = open("renal-clinic");
    const PriorSet prefixed = open("shipped:renal-clinic");
    EXPECT_EQ(plain.name, "shipped:renal-clinic");
    EXPECT_EQ(prefixed.name, plain.name);
    EXPECT_EQ(prefixed.digest, plain.digest);
    EXPECT_EQ(shipped_prior_text("even"), shipped_prior_text("shipped:even"));
}

TEST(OpenPriorSet, GivesTheFileAndItsShippedCopyTheSameDigest) {
    const PriorSet file = open(STEELYARD_SOURCE_DIR "/priors/sets/renal-clinic.yaml");
    EXPECT_EQ(file.digest, open("renal-clinic").digest);
    EXPECT_TRUE(file.digest.starts_with("sha256:"));
    EXPECT_NE(file.digest, open("even").digest);
}

TEST(OpenPriorSet, ShipsTheFilesByteForByte) {
    for (const std::string& name : shipped_prior_sets()) {
        std::ifstream in(STEELYARD_SOURCE_DIR "/priors/sets/" + name + ".yaml", std::ios::binary);
        std::ostringstream text;
        text << in.rdbuf();
        EXPECT_EQ(shipped_prior_text(name), text.str()) << name;
    }
}

TEST(OpenPriorSet, HintsAtTheNearestNameWhenItKnowsNone) {
    for (const char* word : {"renal-clinc", "shipped:renal-clinc"}) {
        try {
            static_cast<void>(open(word));
            FAIL() << word;
        } catch (const document::LoadError& error) {
            const document::Diagnostic fault = error.faults().sorted().at(0);
            EXPECT_EQ(fault.code, document::Code::unreadable_file);
            EXPECT_EQ(fault.hint, "did you mean renal-clinic?");
            EXPECT_EQ(fault.where, (document::SourcePosition{word, 0, 0}));
        }
    }
}

TEST(OpenPriorSet, RefusesAShippedSetThatNamesACauseTheTablesLack) {
    std::vector<std::string> six = test::shipped_causes();
    six.pop_back();
    EXPECT_NO_THROW(static_cast<void>(open_prior_set("renal-clinic", six)));
    try {
        static_cast<void>(open_prior_set("renal-clinic-overlap", six));
        FAIL() << "the composite is not known";
    } catch (const document::LoadError& error) {
        const document::Diagnostic fault = error.faults().sorted().at(0);
        EXPECT_EQ(fault.code, document::Code::unknown_cause);
        EXPECT_EQ(fault.where.file, "shipped:renal-clinic-overlap.yaml");
    }
}

TEST(ShippedPriorText, ThrowsForANameThatIsNotShipped) {
    EXPECT_THROW(static_cast<void>(shipped_prior_text("nowhere")), std::invalid_argument);
}

}  // namespace
}  // namespace steelyard::priors
