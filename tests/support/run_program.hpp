// SPDX-License-Identifier: Apache-2.0
#pragma once
// Runs the built program as a user does: a process, with standard output, standard error and exit code apart,
// in a private folder that is removed afterwards.

#include <fcntl.h>
#include <gtest/gtest.h>
#include <spawn.h>
#include <sys/wait.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

extern char** environ;  // NOLINT: POSIX

namespace steelyard::test {

/// A folder of the test's own, removed at the end.
class WorkDir {
  public:
    explicit WorkDir(const std::filesystem::path& parent = std::filesystem::temp_directory_path()) {
        std::string name = (parent / "steelyard-test-XXXXXX").string();
        if (mkdtemp(name.data()) == nullptr) {
            throw std::runtime_error("no temporary folder");
        }
        path_ = name;
    }
    WorkDir(const WorkDir&) = delete;
    WorkDir& operator=(const WorkDir&) = delete;
    ~WorkDir() {
        std::error_code ignored;
        std::filesystem::remove_all(path_, ignored);
    }
    const std::filesystem::path& path() const { return path_; }
    std::string file(const std::string& name) const { return (path_ / name).string(); }
    std::string write(const std::string& name, const std::string& text) const {
        std::filesystem::create_directories((path_ / name).parent_path());
        std::ofstream(path_ / name, std::ios::binary) << text;
        return file(name);
    }

  private:
    std::filesystem::path path_;
};

inline std::string text_of(const std::filesystem::path& path) {
    std::ifstream in(path, std::ios::binary);
    if (!in) {
        throw std::runtime_error("cannot read " + path.string());
    }
    std::stringstream text;
    text << in.rdbuf();
    return text.str();
}

/// Line breaks and runs of blanks as one blank: what a reader reads, wherever lines are broken.
inline std::string in_one_line(const std::string& text) {
    std::istringstream words(text);
    std::string line;
    for (std::string word; words >> word;) {
        line += (line.empty() ? "" : " ") + word;
    }
    return line;
}

struct Outcome {
    int code = -1;
    std::string out, err;
};

/// @param arguments  after the program's name   @param input  for standard input
inline Outcome run(const std::vector<std::string>& arguments, const std::string& input = {},
                   const std::vector<std::string>& environment = {}) {
    const WorkDir dir;
    const std::string in = dir.write("in", input);
    std::vector<std::string> words = {STEELYARD_PROGRAM};
    words.insert(words.end(), arguments.begin(), arguments.end());
    std::vector<char*> argv;
    for (std::string& word : words) {
        argv.push_back(word.data());
    }
    argv.push_back(nullptr);
    std::vector<std::string> settings = environment;
    for (char** entry = environ; *entry != nullptr; ++entry) {
        settings.emplace_back(*entry);
    }
    std::vector<char*> envp;
    for (std::string& entry : settings) {
        envp.push_back(entry.data());
    }
    envp.push_back(nullptr);

    posix_spawn_file_actions_t actions{};
    posix_spawn_file_actions_init(&actions);
    posix_spawn_file_actions_addopen(&actions, 0, in.c_str(), O_RDONLY, 0);
    posix_spawn_file_actions_addopen(&actions, 1, dir.file("out").c_str(), O_WRONLY | O_CREAT | O_TRUNC,
                                     0600);
    posix_spawn_file_actions_addopen(&actions, 2, dir.file("err").c_str(), O_WRONLY | O_CREAT | O_TRUNC,
                                     0600);
    pid_t child = 0;
    const int failed = posix_spawn(&child, STEELYARD_PROGRAM, &actions, nullptr, argv.data(), envp.data());
    posix_spawn_file_actions_destroy(&actions);
    if (failed != 0) {
        throw std::runtime_error("cannot start " STEELYARD_PROGRAM);
    }
    int status = 0;
    waitpid(child, &status, 0);
    Outcome outcome;
    outcome.code = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
    outcome.out = text_of(dir.file("out"));
    outcome.err = text_of(dir.file("err"));
    return outcome;
}

}  // namespace steelyard::test
