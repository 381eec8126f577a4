// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include <filesystem>
#include <fstream>
#include <iostream>
#include <sstream>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::printed;

/// A folder of its own for each test.
class ReadText : public ::testing::Test {
  protected:
    void SetUp() override {
        folder_ = std::filesystem::path(::testing::TempDir()) /
                  (std::string("steelyard_read_text_") +
                   ::testing::UnitTest::GetInstance()->current_test_info()->name());
        std::filesystem::remove_all(folder_);
        std::filesystem::create_directories(folder_);
    }
    void TearDown() override { std::filesystem::remove_all(folder_); }

    std::string file(const std::string& name, const std::string& text) const {
        const std::string path = (folder_ / name).string();
        std::ofstream(path, std::ios::binary) << text;
        return path;
    }

    std::filesystem::path folder_;
};

TEST_F(ReadText, GivesTheBytesOfTheFile) {
    Diagnostics faults;
    const std::string text("a\r\n\0\xFF", 5);
    EXPECT_EQ(read_text(file("f", text), faults), text);
    EXPECT_EQ(read_text(file("g", ""), faults), "");
    EXPECT_TRUE(faults.empty());
}

TEST_F(ReadText, RefusesAFileOverTheLimit) {
    Diagnostics faults;
    Limits limits;
    limits.bytes = 4;
    EXPECT_EQ(read_text(file("f", "1234"), faults, limits), "1234");
    const std::string path = file("g", "12345");
    EXPECT_EQ(read_text(path, faults, limits), std::nullopt);
    EXPECT_EQ(printed(faults), path +
                                   ": error[too-large]: the file has more than 4 bytes\n"
                                   "  hint: split it into several files\n");
}

TEST_F(ReadText, SaysWhyAFileCannotBeRead) {
    Diagnostics faults;
    const std::string gone = (folder_ / "gone.yaml").string();
    EXPECT_EQ(read_text(gone, faults), std::nullopt);
    EXPECT_EQ(read_text(folder_.string(), faults), std::nullopt);
    EXPECT_EQ(printed(faults),
              gone + ": error[unreadable-file]: the file cannot be read: No such file or directory\n" +
                  folder_.string() + ": error[unreadable-file]: the file cannot be read: it is a folder\n");
}

TEST_F(ReadText, ReadsStandardInputForAHyphen) {
    std::istringstream input("a: 1\n");
    std::streambuf* before = std::cin.rdbuf(input.rdbuf());
    Diagnostics faults;
    const auto text = read_text("-", faults);
    std::cin.rdbuf(before);
    EXPECT_EQ(text, "a: 1\n");
    EXPECT_TRUE(faults.empty());
}

}  // namespace
