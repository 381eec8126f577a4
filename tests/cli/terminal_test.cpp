// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/terminal.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <sstream>

namespace steelyard::cli {
namespace {

TEST(Visible, ShowsControlCharactersAndDirectionMarksAsEscapes) {
    EXPECT_EQ(visible("plain text"), "plain text");
    EXPECT_EQ(visible("\x1b[31mred"), "\\x1b[31mred");
    EXPECT_EQ(visible("a\nb\tc\r"), "a\\x0ab\\x09c\\x0d");
    EXPECT_EQ(visible("\xe2\x80\xae"
                      "evil"),
              "\\u202eevil");
    EXPECT_EQ(visible("\xc2\x9b"
                      "31m"),
              "\\x9b31m");
    EXPECT_EQ(visible("\xff\xfe"), "\\xff\\xfe");
    EXPECT_EQ(visible("na\xc3\xafve"), "na\xc3\xafve");
}

TEST(Visible, LeavesNoControlByteWhateverComesIn) {
    EXPECT_TRUE(rc::check("no control byte is left", [](const std::string& text) {
        for (const char c : visible(text)) {
            RC_ASSERT(static_cast<unsigned char>(c) >= 0x20U);
            RC_ASSERT(static_cast<unsigned char>(c) != 0x7FU);
        }
    }));
}

TEST(TextWidth, CountsCodePoints) {
    EXPECT_EQ(text_width(""), 0U);
    EXPECT_EQ(text_width("abc"), 3U);
    EXPECT_EQ(text_width("\xc2\xb5mol"), 4U);
    EXPECT_EQ(padded("\xc2\xb5", 3), "\xc2\xb5  ");
    EXPECT_EQ(padded_left("12", 4), "  12");
}

TEST(Wrapped, NeverExceedsTheWidthAndLosesNoWord) {
    EXPECT_TRUE(rc::check("every line fits", [](const std::vector<std::string>& raw) {
        std::string text;
        std::string joined;
        for (const std::string& word : raw) {
            std::string letters;
            for (const char c : word) {
                letters += static_cast<char>('a' + static_cast<unsigned char>(c) % 26);
            }
            text += letters + " ";
            joined += letters;
        }
        const std::string result = wrapped(text, "- ", "  ", 20);
        std::string kept;
        std::istringstream lines(result);
        for (std::string line; std::getline(lines, line);) {
            RC_ASSERT(text_width(line) <= 20U);
            for (const char c : line.substr(2)) {
                if (c != ' ') {
                    kept += c;
                }
            }
        }
        RC_ASSERT(kept == joined);
    }));
}

TEST(WantsColour, FollowsTheChoiceBeforeTheTerminal) {
    EXPECT_TRUE(wants_colour(Colour::always, 1));
    EXPECT_FALSE(wants_colour(Colour::never, 1));
    EXPECT_EQ(alarming("x", false), "x");
    EXPECT_NE(alarming("x", true), "x");
}

}  // namespace
}  // namespace steelyard::cli
