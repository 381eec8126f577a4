// SPDX-License-Identifier: Apache-2.0
#pragma once
// The program run within the test's own process, for tests that need no other.

#include <filesystem>
#include <sstream>
#include <string>
#include <vector>

#include "run_program.hpp"
#include "steelyard/cli/commands.hpp"

namespace steelyard::test {

/// A folder in memory where there is one: what is tested is not the speed of a disk.
inline std::filesystem::path quick_folder() {
    const std::filesystem::path memory = "/dev/shm";
    return access(memory.c_str(), W_OK) == 0 ? memory : std::filesystem::temp_directory_path();
}

/// Runs the program within this process, since most tests here need no other.
inline Outcome run_here(std::vector<std::string> arguments) {
    arguments.insert(arguments.begin(), {"steelyard", "--colour", "never"});
    std::vector<const char*> argv;
    for (const std::string& argument : arguments) {
        argv.push_back(argument.c_str());
    }
    std::ostringstream out;
    std::ostringstream err;
    const int code = cli::run_program(static_cast<int>(argv.size()), argv.data(), out, err);
    return {code, out.str(), err.str()};
}

}  // namespace steelyard::test
