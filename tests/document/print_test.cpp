// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::printed;
using steelyard::test::reading;

/// What is printed for one fault at a place of a one-line text.
std::string printed_at(std::string_view line, int column) {
    Diagnostics faults;
    faults.remember_text("f", line);
    faults.add({"f", 1, column}, Code::syntax, "m");
    return printed(faults);
}

TEST(Print, ShowsPlaceCodeMessageLineCaretAndHint) {
    EXPECT_EQ(printed(reading("rows:\n  first: {share: [0.5, 0.5], share: 1}\n").list),
              "text:2:30: error[duplicate-key]: the key share is given twice\n"
              "    first: {share: [0.5, 0.5], share: 1}\n"
              "                               ^\n"
              "  hint: it is first given on line 2\n");
}

TEST(Print, LeavesOutWhatIsNotThere) {
    Diagnostics faults;
    faults.add({"gone.yaml", 0, 0}, Code::unreadable_file, "the file cannot be read");
    EXPECT_EQ(printed(faults), "gone.yaml: error[unreadable-file]: the file cannot be read\n");
}

TEST(Print, KeepsTheCaretUnderItsPlaceBehindTabs) {
    EXPECT_EQ(printed_at("\ta:\tb", 5), "f:1:5: error[syntax]: m\n      a:    b\n            ^\n");
}

TEST(Print, CountsCharactersNotBytesBeforeTheCaret) {
    // The place counts bytes: two for each umlaut, three for the sign.
    EXPECT_EQ(printed_at("äö€ x", 9), "f:1:9: error[syntax]: m\n  äö€ x\n      ^\n");
    // A place inside a character is shown under that character.
    EXPECT_EQ(printed_at("a€b", 3), "f:1:3: error[syntax]: m\n  a€b\n   ^\n");
}

TEST(Print, MayPointBehindTheLastCharacter) {
    EXPECT_EQ(printed_at("abc", 4), "f:1:4: error[syntax]: m\n  abc\n     ^\n");
    EXPECT_EQ(printed_at("abc", 400), "f:1:400: error[syntax]: m\n  abc\n     ^\n");
}

TEST(Print, EscapesWhatCouldActOnATerminal) {
    Diagnostics faults;
    faults.add(
        Diagnostic{{"f\x1b[2J", 1, 4}, Code::syntax, "m\x07\n\xC2\x9B", "h\x7F\xE2\x80\xAE", "a\x1b\xFF z"});
    EXPECT_EQ(printed(faults),
              "f\\x1b[2J:1:4: error[syntax]: m\\x07\\x0a\\x9b\n"
              "  a\\x1b\\xff z\n"
              "           ^\n"
              "  hint: h\\x7f\\u202e\n");
}

TEST(Print, CutsALongLineAroundTheCaret) {
    const std::string line = std::string(300, 'a') + 'X' + std::string(300, 'b');
    EXPECT_EQ(printed_at(line, 301), "f:1:301: error[syntax]: m\n  ..." + std::string(60, 'a') + 'X' +
                                         std::string(39, 'b') + "...\n" + std::string(65, ' ') + "^\n");
    // Near the start only the right is cut, and near the end only the left.
    EXPECT_EQ(printed_at(line, 1), "f:1:1: error[syntax]: m\n  " + std::string(100, 'a') + "...\n  ^\n");
    EXPECT_EQ(printed_at(line, 602), "f:1:602: error[syntax]: m\n  ..." + std::string(60, 'b') + "\n" +
                                         std::string(65, ' ') + "^\n");
}

TEST(Print, CutsALineOfMegabytes) {
    const std::string line = std::string(4'000'000, 'a') + std::string(4'000'000, 'b');
    EXPECT_EQ(printed_at(line, 4'000'001), "f:1:4000001: error[syntax]: m\n  ..." + std::string(60, 'a') +
                                               std::string(40, 'b') + "...\n" + std::string(65, ' ') + "^\n");
}

TEST(Print, LeavesALineThatFitsWhole) {
    const std::string line(100, 'a');
    EXPECT_EQ(printed_at(line, 90),
              "f:1:90: error[syntax]: m\n  " + line + "\n" + std::string(91, ' ') + "^\n");
}

TEST(Print, ColoursTheCodeAndTheCaretOnRequest) {
    Diagnostics faults;
    faults.add(Diagnostic{{"f", 1, 2}, Code::syntax, "m", "", "ab"});
    std::ostringstream out;
    print(out, faults, true);
    EXPECT_EQ(out.str(), "f:1:2: \x1b[1;31merror[syntax]\x1b[0m: m\n  ab\n   \x1b[1;31m^\x1b[0m\n");
}

}  // namespace
