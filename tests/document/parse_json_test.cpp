// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::reading;
using steelyard::test::shown;
using Faults = std::vector<std::string>;

std::string tree_of(std::string_view text) {
    const auto result = reading(text, Syntax::json);
    return result.tree && result.faults.empty() ? shown(*result.tree) : steelyard::test::printed(result.list);
}

/// The first fault's message and hint.
std::string complaint(std::string_view text) {
    const auto result = reading(text, Syntax::json);
    const auto faults = result.list.sorted();
    return faults.empty() ? "none" : faults.front().message + " (" + faults.front().hint + ")";
}

TEST(ParseJson, KeepsEachValueWithItsPlace) {
    EXPECT_EQ(tree_of("{\"a\": 1,\r\n \"b\" :[ true,null ,false],\n\n\"c\":{\"d\":\"x\"}}\n"),
              "1:1{a@1:2=1:7'1' b@2:2=2:7[2:9'true' 2:14'null' 2:20'false'] c@4:1=4:5{d@4:6=4:10\"x\"}}");
    EXPECT_EQ(tree_of("[]"), "1:1[]");
    EXPECT_EQ(tree_of(" {} "), "1:2{}");
    EXPECT_EQ(tree_of("7"), "1:1'7'");
}

TEST(ParseJson, KeepsNumbersAsWritten) {
    EXPECT_EQ(
        tree_of("[1.50, -0, 1E+3, 123456789012345678901234567890, 1e-400, 0.1]"),
        "1:1[1:2'1.50' 1:8'-0' 1:12'1E+3' 1:18'123456789012345678901234567890' 1:50'1e-400' 1:58'0.1']");
}

TEST(ParseJson, FindsTheEndOfStringsWithEscapes) {
    EXPECT_EQ(tree_of(R"(["\"", "\\", "a,]:[\\\"", "\u00e9\t\n", 1])"),
              "1:1[1:2\"\"\" 1:8\"\\\" 1:14\"a,]:[\\\"\" 1:27\"é\t\n\" 1:41'1']");
    EXPECT_EQ(tree_of(R"({"a\"b": 1, "c": 2})"), "1:1{a\"b@1:2=1:10'1' c@1:13=1:18'2'}");
}

TEST(ParseJson, SkipsAByteOrderMark) {
    EXPECT_EQ(tree_of("\xEF\xBB\xBF[1]"), "1:1[1:2'1']");
}

TEST(ParseJson, TakesNullForEmptyButNotATextOfThatName) {
    const auto result = reading(R"([null, "null", ""])", Syntax::json);
    EXPECT_TRUE(result.tree->items[0].is_null());
    EXPECT_FALSE(result.tree->items[1].is_null());
    EXPECT_FALSE(result.tree->items[2].is_null());
}

TEST(ParseJson, RefusesDuplicateKeysAfterDecodingThem) {
    const auto result = reading(R"({"a": 1, "\u0061": 2})", Syntax::json);
    EXPECT_EQ(result.faults, Faults{"1:10 duplicate-key"});
    EXPECT_EQ(result.tree->find("a")->text, "1");
}

TEST(ParseJson, PlacesASyntaxFaultAtTheTokenAtFault) {
    EXPECT_EQ(reading("[1,,2]", Syntax::json).faults, Faults{"1:4 syntax"});
    EXPECT_EQ(reading("[,1]", Syntax::json).faults, Faults{"1:2 syntax"});
    EXPECT_EQ(reading("[1, NaN]", Syntax::json).faults, Faults{"1:5 syntax"});
    EXPECT_EQ(reading("{\"a\", 1}", Syntax::json).faults, Faults{"1:5 syntax"});
    EXPECT_EQ(reading("{\"a\":: 1}", Syntax::json).faults, Faults{"1:6 syntax"});
    EXPECT_EQ(reading("{\"a\": 1\n\"b\": 2}", Syntax::json).faults, Faults{"2:1 syntax"});
    EXPECT_EQ(reading("[1\n", Syntax::json).faults, Faults{"1:3 syntax"});
    EXPECT_EQ(reading("[07]", Syntax::json).faults, Faults{"1:3 syntax"});
    EXPECT_EQ(reading("[nullx]", Syntax::json).faults, Faults{"1:6 syntax"});
    EXPECT_EQ(reading("[1, 2.]", Syntax::json).faults, Faults{"1:5 syntax"});
    EXPECT_EQ(reading("{\"a\": 1, \"b\": 1e400}", Syntax::json).faults, Faults{"1:15 out-of-range"});
}

TEST(ParseJson, SaysWhatToDoAboutCommonMistakes) {
    EXPECT_EQ(complaint("['a']"),
              "the text is not well-formed JSON: invalid literal (JSON has double quotes only)");
    EXPECT_EQ(
        complaint("[1, ]"),
        "the text is not well-formed JSON: unexpected ']'; expected '[', '{', or a literal (a comma before a "
        "closing bracket or brace is not allowed)");
    EXPECT_EQ(complaint("[1 # one\n]"),
              "the text is not well-formed JSON: invalid literal; expected ']' (JSON has no comments)");
    EXPECT_EQ(complaint("[1"),
              "the text is not well-formed JSON: unexpected end of input; expected ']' (a closing bracket, "
              "brace or "
              "quote is missing)");
    EXPECT_EQ(complaint("[1e999]"), "the number 1e999 is too large ()");
}

TEST(ParseJson, ReadsToTheLimitsAndNoFurther) {
    Limits limits;
    limits.depth = 2;
    limits.values = 4;
    EXPECT_EQ(reading("[[1, 2]]", Syntax::json, limits).faults, Faults{});
    EXPECT_EQ(reading("[[[1]]]", Syntax::json, limits).faults, Faults{"1:3 too-deep"});
    EXPECT_EQ(reading("[[1, 2, 3]]", Syntax::json, limits).faults, Faults{"1:9 too-many-values"});
    EXPECT_FALSE(reading("[[1, 2, 3]]", Syntax::json, limits).tree);
}

TEST(ParseJson, EndsOnEveryTextOfOneOrTwoBytes) {
    for (int first = 0; first < 256; ++first) {
        for (int second = -1; second < 256; ++second) {
            std::string text(1, static_cast<char>(first));
            if (second >= 0) {
                text += static_cast<char>(second);
            }
            const auto result = reading(text, Syntax::json);
            EXPECT_TRUE(result.tree.has_value() || !result.faults.empty()) << first << ' ' << second;
        }
    }
}

}  // namespace
