// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/sources.hpp"

#include <gtest/gtest.h>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::brief;
using steelyard::test::reading;
using Faults = std::vector<std::string>;

constexpr std::string_view sources_text =
    "sources:\n"
    "  larkmoor-2026: Agreed at the Larkmoor meeting\n"
    "  a.1: {cite: Some study, doi: 10.1/x, seen: abstract}\n";

TEST(ReadSources, ReadsPlainTextsAndMappings) {
    auto [tree, faults, lines] = reading(sources_text);
    StrictMap map(*tree, "", faults);
    const Sources sources = read_sources(map, faults);
    map.finish();
    ASSERT_EQ(sources.size(), 2U);
    EXPECT_EQ(sources[0].key, "larkmoor-2026");
    EXPECT_EQ(sources[0].cite, "Agreed at the Larkmoor meeting");
    EXPECT_EQ(sources[0].doi, "");
    EXPECT_EQ(to_string(sources[0].where), "text:2:3");
    EXPECT_EQ(sources[1].cite, "Some study");
    EXPECT_EQ(sources[1].doi, "10.1/x");
    EXPECT_EQ(sources[1].seen, "abstract");
    EXPECT_EQ(find_source(sources, "a.1"), &sources[1]);
    EXPECT_EQ(find_source(sources, "a.2"), nullptr);
    EXPECT_TRUE(faults.empty());
}

TEST(ReadSources, GivesNoneWhenThereAreNone) {
    auto [tree, faults, lines] = reading("a: 1");
    StrictMap map(*tree, "", faults);
    EXPECT_TRUE(read_sources(map, faults).empty());
    EXPECT_TRUE(faults.empty());
}

TEST(ReadSources, ReportsEachBadSource) {
    auto [tree, faults, lines] =
        reading("sources:\n  a b: x\n  c: {doi: 1}\n  d: {cite: x, year: 2}\n  e: [x]\n  f:\n  -g: x\n");
    StrictMap map(*tree, "", faults);
    read_sources(map, faults);
    EXPECT_EQ(brief(faults), (Faults{"2:3 bad-identifier", "3:6 missing-key", "4:16 unknown-key",
                                     "5:6 wrong-type", "6:3 empty-value", "7:3 bad-identifier"}));
}

TEST(ReadSources, MustBeAMapping) {
    auto [tree, faults, lines] = reading("sources: [a]");
    StrictMap map(*tree, "", faults);
    read_sources(map, faults);
    EXPECT_EQ(brief(faults), Faults{"1:10 wrong-type"});
}

/// Grounds of a mapping written on one line, with the sources above.
struct Read {
    std::optional<Grounds> grounds;
    Faults faults;
};

Read grounds_of(std::string_view row, bool practice_allowed = false) {
    const std::string text = std::string(sources_text) + "row: " + std::string(row) + "\n";
    auto [tree, faults, lines] = reading(text);
    StrictMap map(*tree, "", faults);
    const Sources sources = read_sources(map, faults);
    StrictMap mapping(*map.required("row"), "row", faults);
    Read result;
    result.grounds = read_grounds(mapping, sources, practice_allowed, faults);
    mapping.finish();
    result.faults = brief(faults);
    return result;
}

TEST(ReadGrounds, ReadsTheBasisAndOneSourceOrSeveral) {
    const Read one = grounds_of("{basis: study, source: a.1}");
    ASSERT_TRUE(one.grounds);
    EXPECT_EQ(one.grounds->basis, Basis::study);
    EXPECT_EQ(one.grounds->sources, std::vector<std::string>{"a.1"});
    EXPECT_EQ(one.faults, Faults{});
    const Read two = grounds_of("{basis: review, source: [a.1, larkmoor-2026]}");
    EXPECT_EQ(two.grounds->sources, (std::vector<std::string>{"a.1", "larkmoor-2026"}));
    EXPECT_EQ(two.faults, Faults{});
}

TEST(ReadGrounds, NeedsASourceForWhatWasReadOnly) {
    for (const std::string_view basis : {"study", "review", "guideline"}) {
        EXPECT_EQ(grounds_of("{basis: " + std::string(basis) + "}").faults, Faults{"4:6 missing-key"})
            << basis;
    }
    for (const std::string_view basis : {"practice", "elicited", "memory"}) {
        const Read read = grounds_of("{basis: " + std::string(basis) + "}", true);
        EXPECT_EQ(read.faults, Faults{}) << basis;
        EXPECT_EQ(to_string(read.grounds->basis), basis);
    }
}

TEST(ReadGrounds, RefusesPracticeWhereItIsNotAllowed) {
    const Read read = grounds_of("{basis: practice}");
    EXPECT_EQ(read.faults, Faults{"4:14 bad-basis"});
    EXPECT_FALSE(read.grounds);
}

TEST(ReadGrounds, ReportsUnknownWordsAtTheirPlace) {
    EXPECT_EQ(grounds_of("{basis: studdy, source: a.1}").faults, Faults{"4:14 bad-basis"});
    EXPECT_EQ(grounds_of("{source: a.1}").faults, Faults{"4:6 missing-key"});
    EXPECT_EQ(grounds_of("{basis: study, source: []}").faults, Faults{"4:29 empty-value"});
    const Read read = grounds_of("{basis: study, source: [a.1, a.2, [b]]}");
    EXPECT_EQ(read.faults, (Faults{"4:35 unknown-source", "4:40 wrong-type"}));
    // What is known is still given, so that it does not count as unused.
    EXPECT_EQ(read.grounds->sources, std::vector<std::string>{"a.1"});
}

TEST(IsJudged, HoldsForJudgementAndMemoryAlone) {
    EXPECT_TRUE(is_judged(Basis::elicited));
    EXPECT_TRUE(is_judged(Basis::memory));
    for (const Basis basis : {Basis::study, Basis::review, Basis::guideline, Basis::practice}) {
        EXPECT_FALSE(is_judged(basis)) << to_string(basis);
    }
}

}  // namespace
