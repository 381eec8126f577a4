// SPDX-License-Identifier: Apache-2.0
// Every file of tests/data/bad/document must be refused at the place and with the code it states: in its
// first line
// (`# expect: LINE:COLUMN code`) or, where a first line would change the matter, in a file of the same name +
// .expect.
#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "support.hpp"

namespace {

namespace document = steelyard::document;
namespace fs = std::filesystem;

std::string contents(const fs::path& path) {
    std::ifstream in(path, std::ios::binary);
    std::ostringstream text;
    text << in.rdbuf();
    return text.str();
}

std::vector<std::string> bad_files() {
    std::vector<std::string> names;
    for (const fs::directory_entry& entry : fs::directory_iterator(STEELYARD_TEST_DIR "/data/bad/document")) {
        if (entry.path().extension() != ".expect") {
            names.push_back(entry.path().filename().string());
        }
    }
    std::sort(names.begin(), names.end());
    return names;
}

std::string expectation(const fs::path& path, const std::string& text) {
    fs::path beside = path;
    beside += ".expect";
    const std::string stated = fs::exists(beside) ? contents(beside) : text;
    const std::string start = "# expect: ";
    const std::string line = stated.substr(0, stated.find('\n'));
    return line.starts_with(start) ? line.substr(start.size()) : "no expectation in " + path.string();
}

class BadText : public ::testing::TestWithParam<std::string> {};

TEST_P(BadText, IsRefusedWhereAndAsItStates) {
    const fs::path path = fs::path(STEELYARD_TEST_DIR "/data/bad/document") / GetParam();
    const std::string text = contents(path);
    const document::Syntax syntax =
        path.extension() == ".json" ? document::Syntax::json : document::Syntax::yaml;
    const steelyard::test::Reading result = steelyard::test::reading(text, syntax);
    EXPECT_EQ(result.faults, std::vector<std::string>{expectation(path, text)})
        << steelyard::test::printed(result.list);
    for (const document::Diagnostic& fault : result.list.sorted()) {
        EXPECT_FALSE(fault.message.empty());
        EXPECT_FALSE(fault.message.ends_with('.')) << fault.message;
        EXPECT_EQ(fault.message.find("yaml-cpp"), std::string::npos) << fault.message;
        EXPECT_EQ(fault.message.find("json.exception"), std::string::npos) << fault.message;
    }
}

INSTANTIATE_TEST_SUITE_P(Folder, BadText, ::testing::ValuesIn(bad_files()), [](const auto& param) {
    std::string name = param.param;
    std::replace_if(
        name.begin(), name.end(), [](char c) { return c == '-' || c == '.'; }, '_');
    return name;
});

TEST(BadTexts, AreThere) {
    EXPECT_GE(bad_files().size(), 35U);
}

}  // namespace
