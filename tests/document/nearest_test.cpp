// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include "steelyard/document/strict_map.hpp"

namespace {

using steelyard::document::nearest;

TEST(Nearest, IsTheKnownNameWithFewestEdits) {
    const std::vector<std::string> known{"share", "shape", "worth", "source"};
    EXPECT_EQ(nearest("shar", known), "share");       // one letter left out
    EXPECT_EQ(nearest("worht", known), "worth");      // two letters swapped, one edit
    EXPECT_EQ(nearest("sourcess", known), "source");  // two more, of eight letters
    EXPECT_EQ(nearest("shapes", known), "shape");
}

TEST(Nearest, IsNothingBeyondAThirdOfTheWord) {
    const std::vector<std::string> known{"share", "sd"};
    EXPECT_EQ(nearest("st", known), "");       // one edit, but a third of two letters is none
    EXPECT_EQ(nearest("shxxe", known), "");    // two edits of five letters
    EXPECT_EQ(nearest("sharing", known), "");  // three edits of seven letters
    EXPECT_EQ(nearest("", known), "");
    EXPECT_EQ(nearest("share", {}), "");
}

TEST(Nearest, PrefersTheFirstOfEquals) {
    const std::vector<std::string> known{"abcx", "abcy"};
    EXPECT_EQ(nearest("abcz", known), "abcx");
}

TEST(Nearest, DoesNotWorkOnAbsurdlyLongWords) {
    const std::string word(100'000, 'a');
    EXPECT_EQ(nearest(word, std::vector<std::string>{word}), "");
}

}  // namespace
