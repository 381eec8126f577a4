// SPDX-License-Identifier: Apache-2.0
#include <csignal>
#include <iostream>

#include "steelyard/cli/commands.hpp"

int main(int argc, char** argv) {
    // A reader that closes the pipe early (`| head`) has had what it wanted: that is no failure.
    std::signal(SIGPIPE, SIG_IGN);  // NOLINT(cert-err33-c)
    std::ios::sync_with_stdio(false);
    const int code = steelyard::cli::run_program(argc, argv, std::cout, std::cerr);
    std::cout.flush();
    return code;
}
