// SPDX-License-Identifier: Apache-2.0
// Each file of tests/data/bad/priors holds one mistake; its first line says where it is and what it is
// called.
#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "text_of.hpp"

namespace steelyard::priors {
namespace {

std::vector<std::string> bad_files() {
    std::vector<std::string> names;
    for (const auto& entry : std::filesystem::directory_iterator(STEELYARD_TEST_DIR "/data/bad/priors")) {
        if (entry.path().extension() == ".yaml") {
            names.push_back(entry.path().stem().string());
        }
    }
    std::sort(names.begin(), names.end());
    return names;
}

std::string text_of_file(const std::string& name) {
    std::ifstream in(STEELYARD_TEST_DIR "/data/bad/priors/" + name + ".yaml");
    std::ostringstream text;
    text << in.rdbuf();
    return text.str();
}

class BadPriorSet : public testing::TestWithParam<std::string> {};

TEST_P(BadPriorSet, IsRefusedAtItsMistakeAndForNothingElse) {
    const std::string text = text_of_file(GetParam());
    const std::string expect = "# expect: ";
    ASSERT_TRUE(text.starts_with(expect));
    const std::string wanted = text.substr(expect.size(), text.find('\n') - expect.size());
    const std::vector<document::Diagnostic> faults = test::faults_of(text, test::shipped_causes());
    std::string found;
    for (const document::Diagnostic& fault : faults) {
        found += (found.empty() ? "" : ", ") + std::to_string(fault.where.line) + ":" +
                 std::to_string(fault.where.column) + " " + std::string(document::to_string(fault.code));
        EXPECT_FALSE(fault.message.empty());
        EXPECT_FALSE(fault.message.ends_with('.')) << fault.message;
        EXPECT_EQ(fault.where.file, "test.yaml");
    }
    EXPECT_EQ(found, wanted) << (faults.empty() ? "" : faults.front().message);
}

INSTANTIATE_TEST_SUITE_P(Files, BadPriorSet, testing::ValuesIn(bad_files()),
                         [](const auto& instance) { return instance.param; });

TEST(BadPriorSets, AreAtLeastTwentyFive) {
    EXPECT_GE(bad_files().size(), 25U);
}

}  // namespace
}  // namespace steelyard::priors
