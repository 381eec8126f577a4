// SPDX-License-Identifier: Apache-2.0
// Each file of tests/data/bad/cases holds one mistake; its first line says where it must be found and under
// which code.
#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <sstream>

#include "run_program.hpp"

namespace steelyard::test {
namespace {

std::vector<std::string> bad_cases() {
    std::vector<std::string> names;
    for (const auto& entry : std::filesystem::directory_iterator(STEELYARD_TEST_DIR "/data/bad/cases")) {
        names.push_back(entry.path().filename().string());
    }
    std::sort(names.begin(), names.end());
    return names;
}

class BadCase : public ::testing::TestWithParam<std::string> {};

TEST_P(BadCase, IsRefusedAtItsPlaceAndNothingIsWeighed) {
    const std::string path = std::string(STEELYARD_TEST_DIR "/data/bad/cases/") + GetParam();
    std::string first = text_of(path);
    first = first.substr(0, first.find('\n'));
    const std::string mark = "# expect: ";
    ASSERT_EQ(first.rfind(mark, 0), 0U) << "the first line must say what is expected";
    const Outcome outcome = run({"weigh", path});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_EQ(outcome.out, "");
    std::istringstream expectations(first.substr(mark.size()));
    for (std::string expected; std::getline(expectations >> std::ws, expected, ';');) {
        const std::size_t space = expected.find(' ');
        const std::string wanted =
            path + ":" + expected.substr(0, space) + ": error[" + expected.substr(space + 1) + "]: ";
        EXPECT_NE(outcome.err.find(wanted), std::string::npos) << "wanted " << wanted << "\ngot\n"
                                                               << outcome.err;
    }
}

INSTANTIATE_TEST_SUITE_P(Folder, BadCase, ::testing::ValuesIn(bad_cases()), [](const auto& parameter) {
    std::string name = parameter.param.substr(0, parameter.param.rfind('.'));
    std::replace_if(
        name.begin(), name.end(), [](char c) { return std::isalnum(static_cast<unsigned char>(c)) == 0; },
        '_');
    return name;
});

TEST(BadInput, FaultsOfAllFilesAreToldInOneRun) {
    const WorkDir dir;
    const std::string priors = dir.write(
        "priors.yaml",
        "format: steelyard.prior-set/1\ntitle: t\ngiven_as: weights\ncauses: {proximal: {weight: -1}}\n");
    const std::string one = dir.write("one.yaml", "case: larkmoor-901\nsex: woman\n");
    const std::string two = dir.write("two.yaml", "case: larkmoor-902\nserum: {potassium: 2.8 g/L}\n");
    const Outcome outcome = run({"weigh", one, two, "--priors", priors});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_EQ(outcome.out, "");
    for (const std::string& wanted :
         {priors + ":4:", one + ":2:6: error[bad-choice]", two + ":2:20: error[bad-unit]"}) {
        EXPECT_NE(outcome.err.find(wanted), std::string::npos) << wanted << "\n" << outcome.err;
    }
    EXPECT_NE(outcome.err.find("nothing was done"), std::string::npos);
}

TEST(BadInput, AMissingFileIsNamed) {
    const Outcome outcome = run({"weigh", "/nowhere/case.yaml"});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.err.find("/nowhere/case.yaml: error[unreadable-file]"), std::string::npos)
        << outcome.err;
}

TEST(BadInput, ACaseGivenTwiceIsRefused) {
    const WorkDir dir;
    const std::string one = dir.write("one.yaml", "case: larkmoor-901\nserum: {potassium: 2.8 mmol/L}\n");
    const Outcome outcome = run({"weigh", one, one});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.err.find("error[conflicting-values]"), std::string::npos) << outcome.err;
}

TEST(BadInput, UnknownPriorSetNamesTheShippedOnes) {
    const WorkDir dir;
    const std::string one = dir.write("one.yaml", "case: larkmoor-901\nserum: {potassium: 2.8 mmol/L}\n");
    const Outcome outcome = run({"weigh", one, "--priors", "renal-clinik"});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.err.find("renal-clinic"), std::string::npos) << outcome.err;
}

}  // namespace
}  // namespace steelyard::test
