// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/output.hpp"

#include <gtest/gtest.h>

#include "run_program.hpp"

namespace steelyard::cli {
namespace {

using test::text_of;
using test::WorkDir;

TEST(WriteWhole, MakesAFileReadableByDefaultPermissionsAndLeavesNothingElse) {
    const WorkDir dir;
    write_whole(dir.file("report.txt"), "whole\n");
    EXPECT_EQ(text_of(dir.file("report.txt")), "whole\n");
    EXPECT_EQ(std::distance(std::filesystem::directory_iterator(dir.path()), {}), 1);
    EXPECT_NE(
        std::filesystem::status(dir.file("report.txt")).permissions() & std::filesystem::perms::group_read,
        std::filesystem::perms::none);
}

TEST(WriteWhole, ReplacesAnOlderFile) {
    const WorkDir dir;
    dir.write("report.txt", "an older and longer text\n");
    write_whole(dir.file("report.txt"), "new\n");
    EXPECT_EQ(text_of(dir.file("report.txt")), "new\n");
}

TEST(WriteWhole, SaysInWordsWhyItCannotWrite) {
    const WorkDir dir;
    EXPECT_THROW(write_whole(dir.file("no/such/folder/x"), "text"), OutputError);
    try {
        write_whole(dir.path().string(), "text");
        FAIL() << "a folder was overwritten";
    } catch (const OutputError& error) {
        EXPECT_NE(std::string(error.what()).find("it is a folder"), std::string::npos);
    }
}

TEST(WriteWhole, TakesADeviceAsItIs) {
    write_whole("/dev/null", "text");
    EXPECT_TRUE(std::filesystem::is_character_file("/dev/null"));
    EXPECT_THROW(write_whole("/dev/full", std::string(1 << 20, 'x')), OutputError);
}

}  // namespace
}  // namespace steelyard::cli
