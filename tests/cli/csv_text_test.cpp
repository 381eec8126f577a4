// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/csv_text.hpp"

#include <gtest/gtest.h>

namespace steelyard::cli {
namespace {

TEST(CsvField, LeavesPlainTextAsItIs) {
    for (const char* text : {"", "larkmoor-017", "a b", "1e-3", "µmol"}) {
        EXPECT_EQ(csv_field(text), text);
    }
}

// RFC 4180, section 2, rules 6 and 7.
TEST(CsvField, QuotesCommasQuotesAndLineBreaks) {
    EXPECT_EQ(csv_field("a,b"), "\"a,b\"");
    EXPECT_EQ(csv_field("a \"b\""), "\"a \"\"b\"\"\"");
    EXPECT_EQ(csv_field("a\nb"), "\"a\nb\"");
    EXPECT_EQ(csv_field("a\r\nb"), "\"a\r\nb\"");
}

TEST(CsvField, AFormulaStaysText) {
    EXPECT_EQ(csv_field("=1+1"), "'=1+1");
    EXPECT_EQ(csv_field("+1"), "'+1");
    EXPECT_EQ(csv_field("-1"), "'-1");
    EXPECT_EQ(csv_field("@A1,2"), "\"'@A1,2\"");
    EXPECT_EQ(csv_field("\t=1"), "'\\x09=1");
}

TEST(CsvField, ControlCharactersBecomeVisible) {
    EXPECT_EQ(csv_field("a\x1b[31m"), "a\\x1b[31m");
    EXPECT_EQ(csv_field(std::string_view("a\0b", 3)), "a\\x00b");
}

}  // namespace
}  // namespace steelyard::cli
