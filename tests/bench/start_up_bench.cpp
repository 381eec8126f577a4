// SPDX-License-Identifier: Apache-2.0
// From command to finished report: wall time and peak memory of whole processes, the program and an empty one
// in turn.
//
// usage: start_up_bench RUNS EMPTY_PROGRAM PROGRAM ARGUMENTS...
// Google Benchmark measures inside one process; here the process itself is what is measured.
#include <fcntl.h>
#include <spawn.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <stdexcept>
#include <string>
#include <vector>

extern char** environ;  // NOLINT: POSIX

namespace {

struct Figures {
    std::vector<double> milliseconds;
    double peak_mebibytes = 0.0;
};

void run_once(const std::vector<char*>& argv, Figures& figures) {
    posix_spawn_file_actions_t actions{};
    posix_spawn_file_actions_init(&actions);
    posix_spawn_file_actions_addopen(&actions, 1, "/dev/null", O_WRONLY, 0);
    const auto start = std::chrono::steady_clock::now();
    pid_t child = 0;
    if (posix_spawn(&child, argv[0], &actions, nullptr, argv.data(), environ) != 0) {
        throw std::runtime_error(std::string("cannot start ") + argv[0]);
    }
    int status = 0;
    rusage usage{};
    wait4(child, &status, 0, &usage);
    const auto end = std::chrono::steady_clock::now();
    posix_spawn_file_actions_destroy(&actions);
    if (!WIFEXITED(status) || WEXITSTATUS(status) != 0) {
        throw std::runtime_error(std::string(argv[0]) + " failed");
    }
    figures.milliseconds.push_back(std::chrono::duration<double, std::milli>(end - start).count());
    figures.peak_mebibytes = std::max(figures.peak_mebibytes, static_cast<double>(usage.ru_maxrss) / 1024.0);
}

void print(const char* name, Figures& figures) {
    std::sort(figures.milliseconds.begin(), figures.milliseconds.end());
    std::printf("%-10s median %6.2f ms   least %6.2f ms   most %6.2f ms   peak %5.1f MiB\n", name,
                figures.milliseconds[figures.milliseconds.size() / 2], figures.milliseconds.front(),
                figures.milliseconds.back(), figures.peak_mebibytes);
}

}  // namespace

int main(int argc, char** argv) {
    if (argc < 4) {
        std::fprintf(stderr, "usage: start_up_bench RUNS EMPTY_PROGRAM PROGRAM ARGUMENTS...\n");
        return 2;
    }
    const int runs = std::max(1, std::atoi(argv[1]));
    std::vector<char*> empty = {argv[2], nullptr};
    std::vector<char*> program(argv + 3, argv + argc);
    program.push_back(nullptr);
    Figures of_empty;
    Figures of_program;
    try {
        for (int i = 0; i < runs; ++i) {
            run_once(empty, of_empty);
            run_once(program, of_program);
        }
    } catch (const std::exception& error) {
        std::fprintf(stderr, "start_up_bench: %s\n", error.what());
        return 1;
    }
    print("empty", of_empty);
    print("steelyard", of_program);
    return 0;
}
