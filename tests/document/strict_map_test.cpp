// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/strict_map.hpp"

#include <gtest/gtest.h>

#include <array>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::brief;
using steelyard::test::printed;
using steelyard::test::reading;
using Faults = std::vector<std::string>;

constexpr std::array<std::string_view, 2> scales{"linear", "log"};

TEST(StrictMap, IsSilentWhenEveryKeyIsReadAndRight) {
    auto [tree, faults, lines] = reading("n: 11\nscale: log\nnote: x\n");
    StrictMap map(*tree, "row", faults);
    EXPECT_TRUE(map.usable());
    EXPECT_EQ(map.what(), "row");
    EXPECT_EQ(map.name("n"), "row.n");
    EXPECT_EQ(map.required_number("n", 1), 11.0);
    EXPECT_EQ(map.required_choice("scale", scales), "log");
    EXPECT_EQ(map.optional_text("note"), "x");
    EXPECT_EQ(map.optional_text("caution"), std::nullopt);
    EXPECT_EQ(map.optional_number("sd"), std::nullopt);
    EXPECT_EQ(map.optional_choice("form", scales), std::nullopt);
    map.finish();
    EXPECT_TRUE(faults.empty());
}

TEST(StrictMap, NamesKeysOfTheTopWithoutAPrefix) {
    auto [tree, faults, lines] = reading("a: 1");
    EXPECT_EQ(StrictMap(*tree, "", faults).name("a"), "a");
}

TEST(StrictMap, ReportsMissingEmptyAndUnknownKeys) {
    auto [tree, faults, lines] = reading("row:\n  mean:\n  nn: 3\n  scael: log\n  colour: red\n");
    StrictMap top(*tree, "", faults);
    StrictMap map(*top.required("row"), "row", faults);
    EXPECT_FALSE(map.required_number("mean"));
    EXPECT_FALSE(map.required_number("sd"));
    EXPECT_FALSE(map.optional_choice("scale", scales));
    map.finish();
    top.finish();
    EXPECT_EQ(printed(faults),
              "text:2:3: error[empty-value]: row.mean is empty\n"
              "    mean:\n"
              "    ^\n"
              "  hint: give it a value, or leave the key out if it may be left out\n"
              "text:2:3: error[missing-key]: the key row.sd is missing\n"
              "    mean:\n"
              "    ^\n"
              "text:3:3: error[unknown-key]: the key row.nn is not known here\n"
              "    nn: 3\n"
              "    ^\n"
              "  hint: known keys: mean, sd, scale\n"
              "text:4:3: error[unknown-key]: the key row.scael is not known here\n"
              "    scael: log\n"
              "    ^\n"
              "  hint: did you mean scale?\n"
              "text:5:3: error[unknown-key]: the key row.colour is not known here\n"
              "    colour: red\n"
              "    ^\n"
              "  hint: known keys: mean, sd, scale\n");
}

TEST(StrictMap, SaysOnceThatANodeIsNoMappingAndThenStaysSilent) {
    auto [tree, faults, lines] = reading("row: [1]");
    StrictMap map(*tree->find("row"), "row", faults);
    EXPECT_FALSE(map.usable());
    EXPECT_EQ(map.required("a"), nullptr);
    EXPECT_EQ(map.optional("a"), nullptr);
    EXPECT_FALSE(map.required_number("a"));
    EXPECT_FALSE(map.required_text("a"));
    EXPECT_FALSE(map.required_choice("a", scales));
    EXPECT_FALSE(map.require_format("f/1"));
    map.finish();
    EXPECT_EQ(printed(faults),
              "text:1:6: error[wrong-type]: row is a list, but must be a mapping of keys to values\n"
              "  row: [1]\n"
              "       ^\n");
}

TEST(StrictMap, NamesTheDocumentWhenTheTopIsNoMapping) {
    auto [tree, faults, lines] = reading("plain");
    const StrictMap map(*tree, "", faults);
    EXPECT_EQ(faults.sorted().at(0).message,
              "the document is a single value, but must be a mapping of keys to values");
}

/// The faults of require_format on a text, and what it returned.
std::pair<bool, Faults> format_of(std::string_view text) {
    auto [tree, faults, lines] = reading(text);
    StrictMap map(*tree, "", faults);
    const bool right = map.require_format("steelyard.prior-set/1");
    return {right, brief(faults)};
}

TEST(RequireFormat, MustStandFirstAndBeTheOneExpected) {
    EXPECT_EQ(format_of("format: steelyard.prior-set/1\ntitle: x"), (std::pair{true, Faults{}}));
    EXPECT_EQ(format_of("title: x\nformat: steelyard.prior-set/1"),
              (std::pair{true, Faults{"1:1 bad-format"}}));
    EXPECT_EQ(format_of("format: steelyard.prior-set/2"), (std::pair{false, Faults{"1:9 bad-format"}}));
    EXPECT_EQ(format_of("format: [a]"), (std::pair{false, Faults{"1:9 bad-format"}}));
    EXPECT_EQ(format_of("format:"), (std::pair{false, Faults{"1:1 bad-format"}}));
    EXPECT_EQ(format_of("title: x"), (std::pair{false, Faults{"1:1 bad-format"}}));
    EXPECT_EQ(format_of("{}"), (std::pair{false, Faults{"1:1 bad-format"}}));
}

TEST(ReadChoice, NamesTheChoicesAndTheNearest) {
    auto [tree, faults, lines] = reading("a: liner\nb: cubic\nc: [log]\n");
    EXPECT_FALSE(read_choice(*tree->find("a"), "scale", scales, faults));
    EXPECT_FALSE(read_choice(*tree->find("b"), "scale", scales, faults));
    EXPECT_FALSE(read_choice(*tree->find("c"), "scale", scales, faults));
    EXPECT_EQ(brief(faults), (Faults{"1:4 bad-choice", "2:4 bad-choice", "3:4 wrong-type"}));
    EXPECT_EQ(faults.sorted()[0].message, "scale is \"liner\", but must be one of linear, log");
    EXPECT_EQ(faults.sorted()[0].hint, "did you mean linear?");
    EXPECT_EQ(faults.sorted()[1].hint, "");
}

TEST(ReadTextValue, RefusesListsAndEmptyTexts) {
    auto [tree, faults, lines] = reading("a: x y\nb: ''\nc: ~\nd: {}\ne: \"~\"\n");
    EXPECT_EQ(read_text_value(*tree->find("a"), "a", faults), "x y");
    EXPECT_FALSE(read_text_value(*tree->find("b"), "b", faults));
    EXPECT_FALSE(read_text_value(*tree->find("c"), "c", faults));
    EXPECT_FALSE(read_text_value(*tree->find("d"), "d", faults));
    EXPECT_EQ(read_text_value(*tree->find("e"), "e", faults), "~");
    EXPECT_EQ(brief(faults), (Faults{"2:4 empty-value", "3:4 empty-value", "4:4 wrong-type"}));
}

TEST(ReadTexts, ReadsAListOfTextsAndNothingElse) {
    auto [tree, faults, lines] = reading("a: [x, \"y\"]\nb: x\nc: [x, , [y]]\n");
    EXPECT_EQ(read_texts(*tree->find("a"), "a", faults), (std::vector<std::string>{"x", "y"}));
    EXPECT_FALSE(read_texts(*tree->find("b"), "b", faults));
    EXPECT_FALSE(read_texts(*tree->find("c"), "c", faults));
    EXPECT_EQ(brief(faults), (Faults{"2:4 wrong-type", "3:8 empty-value", "3:10 wrong-type"}));
}

TEST(IsIdentifier, HoldsForLowerCaseNames) {
    for (const std::string_view text : {"a", "serum_potassium", "x1", "a_"}) {
        EXPECT_TRUE(is_identifier(text)) << text;
    }
    for (const std::string_view text : {"", "_a", "1a", "A", "aB", "a-b", "a b", "ä", "a."}) {
        EXPECT_FALSE(is_identifier(text)) << text;
    }
}

TEST(ReadIdentifier, ReportsANameThatIsNone) {
    auto [tree, faults, lines] = reading("a: urine_ph\nb: Urine pH\n");
    EXPECT_EQ(read_identifier(*tree->find("a"), "finding", faults), "urine_ph");
    EXPECT_FALSE(read_identifier(*tree->find("b"), "finding", faults));
    EXPECT_EQ(brief(faults), Faults{"2:4 bad-identifier"});
}

}  // namespace
