// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include <clocale>
#include <cmath>
#include <locale>

#include "steelyard/document/strict_map.hpp"
#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::brief;
using steelyard::test::reading;

TEST(NumberFrom, ReadsDecimalNumbers) {
    EXPECT_EQ(number_from("0"), 0.0);
    EXPECT_EQ(number_from("-0.25"), -0.25);
    EXPECT_EQ(number_from("+3"), 3.0);
    EXPECT_EQ(number_from("1e3"), 1000.0);
    EXPECT_EQ(number_from("1E-3"), 0.001);
    EXPECT_EQ(number_from(".5"), 0.5);
    EXPECT_EQ(number_from("5."), 5.0);
    EXPECT_EQ(number_from("010"), 10.0);  // not octal
    EXPECT_EQ(number_from("1.7976931348623157e308"), 1.7976931348623157e308);
    EXPECT_EQ(number_from("5e-324"), 5e-324);  // the smallest subnormal
    EXPECT_EQ(number_from("0e-400"), 0.0);
}

TEST(NumberFrom, RefusesEverythingElse) {
    for (const std::string_view text :
         {"",      "+",      "-",     ".",      "e3",     "1e",     "1 ",  " 1",   "1,5",  "1_000",    "0x10",
          "1.2.3", "++1",    "+-1",   "-+1",    "1/3",    "nan",    "NaN", "inf",  "-inf", "infinity", ".nan",
          ".inf",  "nan(1)", "1e400", "-1e400", "1e-400", "1e400x", "~",   "true", "٣"}) {
        EXPECT_EQ(number_from(text), std::nullopt) << text;
    }
}

TEST(NumberFrom, DoesNotCareForTheLocale) {
    struct CommaPoint : std::numpunct<char> {
        char do_decimal_point() const override { return ','; }
    };
    const std::locale before = std::locale::global(std::locale(std::locale::classic(), new CommaPoint));
    const auto point = number_from("0.5"), comma = number_from("0,5");
    const auto tree = reading("a: 0.5").tree;
    const auto json = reading("[0.5]", Syntax::json).tree;
    std::locale::global(before);
    EXPECT_EQ(point, 0.5);
    EXPECT_EQ(comma, std::nullopt);
    ASSERT_TRUE(tree);
    EXPECT_EQ(tree->find("a")->text, "0.5");
    ASSERT_TRUE(json);
    EXPECT_EQ(json->items[0].text, "0.5");
}

/// The fault of reading `a` of a YAML text as a number in [0, 1], printed, or the number.
std::string read_a(std::string_view text) {
    auto [tree, faults, lines] = reading(text);
    const auto value = read_number(*tree->find("a"), "row.a", faults, 0.0, 1.0);
    if (value) {
        return std::to_string(*value);
    }
    const Diagnostic fault = faults.sorted().at(0);
    return std::to_string(fault.where.line) + ':' + std::to_string(fault.where.column) + ' ' +
           std::string(to_string(fault.code)) + ": " + fault.message +
           (fault.hint.empty() ? "" : " (" + fault.hint + ")");
}

TEST(ReadNumber, SaysWhatIsWrongAndWhere) {
    EXPECT_EQ(read_a("a: 0.25"), "0.250000");
    EXPECT_EQ(read_a("a: +1"), "1.000000");
    EXPECT_EQ(read_a("a: \"0.5\""),
              "1:4 not-a-number: row.a is the text \"0.5\", but must be a number (take away the quotes)");
    EXPECT_EQ(read_a("a: half"), "1:4 not-a-number: row.a is \"half\", but must be a number");
    EXPECT_EQ(read_a("a: 0,5"),
              "1:4 not-a-number: row.a is \"0,5\", but must be a number (the decimal mark is a point, and "
              "thousands "
              "are not grouped)");
    EXPECT_EQ(read_a("a: [1]"), "1:4 not-a-number: row.a is a list, but must be a number");
    EXPECT_EQ(read_a("a: {b: 1}"), "1:4 not-a-number: row.a is a mapping, but must be a number");
    EXPECT_EQ(read_a("a:"), "1:1 not-a-number: row.a is empty, but must be a number");
    EXPECT_EQ(read_a("a: .nan"), "1:4 not-finite: row.a is .nan, but must be a finite number");
    EXPECT_EQ(read_a("a: -.INF"), "1:4 not-finite: row.a is -.INF, but must be a finite number");
    EXPECT_EQ(read_a("a: inf"), "1:4 not-finite: row.a is inf, but must be a finite number");
    EXPECT_EQ(read_a("a: 1e-400"),
              "1:4 out-of-range: row.a is 1e-400, which is too large or too close to zero to be held exactly "
              "enough");
    EXPECT_EQ(read_a("a: 1.5"), "1:4 out-of-range: row.a is 1.5, but must be between 0 and 1");
    EXPECT_EQ(read_a("a: -1"), "1:4 out-of-range: row.a is -1, but must be between 0 and 1");
}

TEST(ReadNumber, NamesAOneSidedRangeByItsSide) {
    auto [tree, faults, lines] = reading("a: -1");
    EXPECT_FALSE(read_number(*tree->find("a"), "a", faults, 0.0));
    EXPECT_FALSE(read_number(*tree->find("a"), "a", faults, -HUGE_VAL, -2.0));
    EXPECT_EQ(faults.sorted()[0].message, "a is -1, but must be at least 0");
    EXPECT_EQ(faults.sorted()[1].message, "a is -1, but must be at most -2");
}

TEST(ReadNumbers, ReportsEachBadItemAtItsPlace) {
    auto [tree, faults, lines] = reading("a: [0.5, x, 2, 1]");
    EXPECT_FALSE(read_numbers(*tree->find("a"), "share", faults, 0.0, 1.0));
    EXPECT_EQ(brief(faults), (std::vector<std::string>{"1:10 not-a-number", "1:13 out-of-range"}));
    EXPECT_EQ(faults.sorted()[0].message, "share[2] is \"x\", but must be a number");
}

TEST(ReadNumbers, KeepsTheOrderAndRefusesASingleNumber) {
    auto [tree, faults, lines] = reading("a: [3, 1, 2]\nb: 1\nc: []");
    EXPECT_EQ(read_numbers(*tree->find("a"), "a", faults), (std::vector<double>{3, 1, 2}));
    EXPECT_EQ(read_numbers(*tree->find("c"), "c", faults), std::vector<double>{});
    EXPECT_FALSE(read_numbers(*tree->find("b"), "b", faults));
    EXPECT_EQ(brief(faults), std::vector<std::string>{"2:4 wrong-type"});
}

}  // namespace
