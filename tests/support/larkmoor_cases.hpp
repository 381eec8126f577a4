// SPDX-License-Identifier: Apache-2.0
#pragma once
// The cases of Larkmoor that docs/cases holds, for tests that run over all of them.

#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <string>
#include <vector>

namespace steelyard::test {

/// Paths of all case files, in order.
inline std::vector<std::string> larkmoor_cases() {
    std::vector<std::string> paths;
    for (const auto& entry : std::filesystem::directory_iterator(STEELYARD_SOURCE_DIR "/docs/cases")) {
        if (entry.path().extension() == ".yaml") {
            paths.push_back(entry.path().string());
        }
    }
    std::sort(paths.begin(), paths.end());
    return paths;
}

/// `larkmoor_002`, as a test may be called.
inline std::string larkmoor_name(const ::testing::TestParamInfo<std::string>& path) {
    std::string name = std::filesystem::path(path.param).stem().string();
    std::replace(name.begin(), name.end(), '-', '_');
    return name;
}

}  // namespace steelyard::test
