// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>

#include <fstream>
#include <sstream>

#include "awkward_texts.hpp"

namespace {

TEST(EmbeddedTexts, AreTheFilesByteForByteInTheOrderListed) {
    std::vector<std::string_view> names;
    for (const auto& [name, text] : steelyard::test::awkward_texts()) {
        std::ifstream in(std::string(STEELYARD_TEST_DIR "/data/") + std::string(name), std::ios::binary);
        std::ostringstream file;
        file << in.rdbuf();
        EXPECT_TRUE(file.str() == text) << name;
        names.push_back(name);
    }
    EXPECT_EQ(names, (std::vector<std::string_view>{
                         "bad/document/bad-escape.yaml", "bad/document/empty.yaml",
                         "bad/document/invalid-utf8.yaml", "bad/document/nested-100000-deep.json",
                         "bad/document/windows-line-ends.yaml", "bad/document/zero-byte.yaml"}));
}

}  // namespace
