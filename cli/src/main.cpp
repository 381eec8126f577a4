// SPDX-License-Identifier: Apache-2.0
#include <unistd.h>

#include <cerrno>
#include <csignal>
#include <iostream>
#include <system_error>

#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/fd_stream.hpp"

int main(int argc, char** argv) {
    // A reader that closes the pipe early (`| head`) has had what it wanted: that is no failure.
    std::signal(SIGPIPE, SIG_IGN);  // NOLINT(cert-err33-c)
    steelyard::cli::FdBuffer buffer(STDOUT_FILENO);
    std::ostream out(&buffer);
    const int code = steelyard::cli::run_program(argc, argv, out, std::cerr);
    out.flush();
    if (buffer.error() != 0 && buffer.error() != EPIPE) {
        std::cerr << "steelyard: cannot write the result: " << std::generic_category().message(buffer.error())
                  << '\n';
        return steelyard::cli::usage;
    }
    return code;
}
