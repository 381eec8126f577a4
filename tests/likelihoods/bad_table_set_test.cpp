// SPDX-License-Identifier: Apache-2.0
// Each file of tests/data/bad/tables/FILE/ replaces FILE.yaml of the small set and holds one mistake. Its
// first line says where the mistake must be reported and by which code: in the file itself, or `file
// line:column code` in another.
#include <gtest/gtest.h>

#include <set>

#include "table_files.hpp"

namespace steelyard::test {
namespace {

std::vector<std::string> bad_files() {
    std::vector<std::string> names;
    const std::filesystem::path root = STEELYARD_TEST_DIR "/data/bad/tables";
    for (const auto& entry : std::filesystem::recursive_directory_iterator(root)) {
        if (entry.path().extension() == ".yaml") {
            names.push_back(std::filesystem::relative(entry.path(), root).replace_extension().string());
        }
    }
    std::sort(names.begin(), names.end());
    return names;
}

std::vector<std::string> split(const std::string& text, const std::string& at) {
    std::vector<std::string> parts;
    std::size_t start = 0;
    for (std::size_t end = 0; end != std::string::npos; start = end + at.size()) {
        end = text.find(at, start);
        parts.push_back(text.substr(start, end == std::string::npos ? end : end - start));
    }
    return parts;
}

class BadTableSet : public testing::TestWithParam<std::string> {};

TEST_P(BadTableSet, IsRefusedAtItsMistakeAndForNothingElse) {
    const std::string target = GetParam().substr(0, GetParam().find('/')) + ".yaml";
    const std::string text =
        text_of(std::filesystem::path(STEELYARD_TEST_DIR "/data/bad/tables") / (GetParam() + ".yaml"));
    const std::string expect = "# expect: ";
    ASSERT_TRUE(text.starts_with(expect));
    std::multiset<std::string> wanted;
    for (const std::string& part : split(text.substr(expect.size(), text.find('\n') - expect.size()), ", ")) {
        const bool names_file = part.find(".yaml") != std::string::npos;
        wanted.insert("small/" + (names_file ? part : target + " " + part));
    }
    Files files = small_files();
    text_named(files, target) = text;
    const std::vector<document::Diagnostic> faults = faults_of(files);
    std::multiset<std::string> found;
    for (const document::Diagnostic& fault : faults) {
        found.insert(summary_of({fault}));
        EXPECT_FALSE(fault.message.empty());
        EXPECT_FALSE(fault.message.ends_with('.')) << fault.message;
    }
    EXPECT_EQ(found, wanted) << messages_of(faults);
}

INSTANTIATE_TEST_SUITE_P(Files, BadTableSet, testing::ValuesIn(bad_files()), [](const auto& instance) {
    std::string name = instance.param;
    std::replace(name.begin(), name.end(), '/', '_');
    return name;
});

TEST(BadTableSets, AreAtLeastAHundred) {
    EXPECT_GE(bad_files().size(), 100U);
}

}  // namespace
}  // namespace steelyard::test
