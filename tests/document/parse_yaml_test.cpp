// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::reading;
using steelyard::test::shown;
using Faults = std::vector<std::string>;

/// The tree of a text that must have no fault.
std::string tree_of(std::string_view text) {
    const auto result = reading(text);
    return result.tree && result.faults.empty() ? shown(*result.tree) : steelyard::test::printed(result.list);
}

TEST(ParseYaml, KeepsEachValueWithItsPlace) {
    EXPECT_EQ(tree_of("a: 1\nb:\n  - x y\n  - {c: \"2\", d: [e]}\n"),
              "1:1{a@1:1=1:4'1' b@2:1=3:3[3:5'x y' 4:5{c@4:6=4:9\"2\" d@4:14=4:17[4:18'e']}]}");
    EXPECT_EQ(tree_of("just text"), "1:1'just text'");
    EXPECT_EQ(tree_of("- - 1\n  - 2\n"), "1:1[1:3[1:5'1' 2:5'2']]");
    EXPECT_EQ(tree_of("a: {}\nb: []\n"), "1:1{a@1:1=1:4{} b@2:1=2:4[]}");
}

TEST(ParseYaml, CountsColumnsInBytes) {
    EXPECT_EQ(tree_of("ä: €\n"), "1:1{ä@1:1=1:5'€'}");
}

TEST(ParseYaml, SkipsAByteOrderMarkAndCommentsAndReadsWindowsLineEnds) {
    EXPECT_EQ(tree_of("\xEF\xBB\xBF# c\r\na: 1  # d\r\n\r\nb: 'x'\r\n...\r\n"),
              "2:1{a@2:1=2:4'1' b@4:1=4:4\"x\"}");
    EXPECT_EQ(tree_of("---\na: 1\n"), "2:1{a@2:1=2:4'1'}");
}

TEST(ParseYaml, KeepsNumbersAndWordsAsWritten) {
    EXPECT_EQ(
        tree_of("[010, 1e-400, .nan, yes, 0x1F, 12:30, 1_000, 2026-01-02, +1.50, true]"),
        "1:1[1:2'010' 1:7'1e-400' 1:15'.nan' 1:21'yes' 1:26'0x1F' 1:32'12:30' 1:39'1_000' 1:46'2026-01-02' "
        "1:58'+1.50' 1:65'true']");
}

TEST(ParseYaml, TellsQuotedTextsFromPlainOnes) {
    EXPECT_EQ(tree_of("[1, \"1\", '1', '', \"null\"]"),
              "1:1[1:2'1' 1:5\"1\" 1:10\"1\" 1:15\"\" 1:19\"null\"]");
    EXPECT_EQ(tree_of("a: |\n  1\nb: >-\n  2\n"), "1:1{a@1:1=1:4\"1\n\" b@3:1=3:4\"2\"}");
}

TEST(ParseYaml, PlacesAnEmptyValueAtItsKeyOrDash) {
    EXPECT_EQ(tree_of("a:\nb:\n\n# c\nd: 1\n"), "1:1{a@1:1=1:1'' b@2:1=2:1'' d@5:1=5:4'1'}");
    EXPECT_EQ(tree_of("-\n- # c\n\n-\n"), "1:1[1:1'' 2:1'' 4:1'']");
    EXPECT_EQ(tree_of("a:\n  -\n  - 1\nb: 1"), "1:1{a@1:1=2:3[2:3'' 3:5'1'] b@4:1=4:4'1'}");
    EXPECT_EQ(tree_of("-\n-"), "1:1[1:1'' 2:1'']");
    EXPECT_EQ(tree_of("{a, b: 1}"), "1:1{a@1:2=1:2'' b@1:5=1:8'1'}");
}

TEST(ParseYaml, KeepsHowANullWasWritten) {
    const auto result = reading("[~, null, Null, NULL, '', nil, \"~\"]");
    ASSERT_TRUE(result.tree);
    std::string nulls;
    for (const Node& item : result.tree->items) {
        nulls += item.text + (item.is_null() ? "+ " : "- ");
    }
    EXPECT_EQ(nulls, "~+ null+ Null+ NULL+ - nil- ~- ");
    EXPECT_EQ(tree_of("null: 1\n~: 2\n"), "1:1{null@1:1=1:7'1' ~@2:1=2:4'2'}");
}

TEST(ParseYaml, GoesOnAfterAFaultThatLeavesTheTreeUsable) {
    const auto result = reading("a: 1\na: 2\nb: &x 3\nc: !t 4\nd: 5\n");
    EXPECT_EQ(result.faults, (Faults{"2:1 duplicate-key", "3:4 anchor", "4:4 tag"}));
    ASSERT_TRUE(result.tree);
    EXPECT_EQ(result.tree->entries.size(), 4U);
    EXPECT_EQ(result.tree->find("a")->text, "1");  // the first stays
    EXPECT_EQ(result.tree->find("d")->text, "5");
}

TEST(ParseYaml, ReportsEveryAliasAndMergeKeyButGivesNoTree) {
    const auto result = reading("a: &x {b: 1}\nc: *x\nd:\n  <<: *x\n");
    EXPECT_EQ(result.faults, (Faults{"1:4 anchor", "2:4 alias", "4:3 merge-key", "4:7 alias"}));
    EXPECT_FALSE(result.tree);
}

TEST(ParseYaml, AllowsAQuotedMergeSign) {
    EXPECT_EQ(tree_of("\"<<\": 1"), "1:1{<<@1:1=1:7'1'}");
}

TEST(ParseYaml, ReportsARepeatedKeyOnceForEachRepeat) {
    const auto result = reading("a: 1\nb: 2\na: 3\nb: 4\na: 5\n");
    EXPECT_EQ(result.faults, (Faults{"3:1 duplicate-key", "4:1 duplicate-key", "5:1 duplicate-key"}));
    EXPECT_EQ(shown(*result.tree), "1:1{a@1:1=1:4'1' b@2:1=2:4'2'}");
}

TEST(ParseYaml, EndsOnEveryTextOfOneOrTwoBytes) {
    for (int first = 0; first < 256; ++first) {
        for (int second = -1; second < 256; ++second) {
            std::string text(1, static_cast<char>(first));
            if (second >= 0) {
                text += static_cast<char>(second);
            }
            const auto result = reading(text);
            EXPECT_TRUE(result.tree.has_value() || !result.faults.empty()) << first << ' ' << second;
        }
    }
}

TEST(ParseYaml, ReadsToTheLimitOfDepthAndNoDeeper) {
    Limits limits;
    limits.depth = 3;
    EXPECT_EQ(reading("[[[1]]]", Syntax::yaml, limits).faults, Faults{});
    EXPECT_EQ(reading("[[[[1]]]]", Syntax::yaml, limits).faults, Faults{"1:4 too-deep"});
    EXPECT_EQ(reading("a:\n - b:\n   c: 1\n", Syntax::yaml, limits).faults, Faults{});
    EXPECT_EQ(reading("a:\n - b:\n   - 1\n", Syntax::yaml, limits).faults, Faults{"3:4 too-deep"});
    limits.depth = 0;
    EXPECT_EQ(reading("1", Syntax::yaml, limits).faults, Faults{});
    EXPECT_EQ(reading("[]", Syntax::yaml, limits).faults, Faults{"1:1 too-deep"});
}

TEST(ParseYaml, SurvivesNestingInEveryForm) {
    for (const std::string_view part : {"[", "{", "- ", "? ", "[a: ", "{a: ", "a: [", "!t ", "&a ", "[{"}) {
        std::string text;
        for (int i = 0; i < 100'000; ++i) {
            text += part;
        }
        EXPECT_FALSE(reading(text).faults.empty()) << part;
    }
}

TEST(ParseYaml, CountsValuesAndBytes) {
    Limits limits;
    limits.values = 4;
    EXPECT_EQ(reading("[1, 2, 3]", Syntax::yaml, limits).faults, Faults{});
    EXPECT_EQ(reading("[1, 2, 3, 4]", Syntax::yaml, limits).faults, Faults{"1:11 too-many-values"});
    limits.bytes = 9;
    EXPECT_EQ(reading("[1, 2, 3]", Syntax::yaml, limits).faults, Faults{});
    EXPECT_EQ(reading("[1, 2, 3]\n", Syntax::yaml, limits).faults, Faults{"0:0 too-large"});
}

TEST(SyntaxOf, GoesByTheNameThenByTheFirstSign) {
    EXPECT_EQ(syntax_of("case.json", "a: 1"), Syntax::json);
    EXPECT_EQ(syntax_of("CASE.JSON", ""), Syntax::json);
    EXPECT_EQ(syntax_of("case.yaml", "{a: 1}"), Syntax::yaml);
    EXPECT_EQ(syntax_of("case.yml", "[1]"), Syntax::yaml);
    EXPECT_EQ(syntax_of("-", "\xEF\xBB\xBF \n {"), Syntax::json);
    EXPECT_EQ(syntax_of("-", "[1]"), Syntax::json);
    EXPECT_EQ(syntax_of("-", "a: 1"), Syntax::yaml);
    EXPECT_EQ(syntax_of("-", ""), Syntax::yaml);
    EXPECT_EQ(syntax_of("json", "a: 1"), Syntax::yaml);
}

}  // namespace
