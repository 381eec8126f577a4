// SPDX-License-Identifier: Apache-2.0
#include <unistd.h>

#include <cerrno>
#include <csignal>
#include <iostream>
#include <sstream>
#include <string_view>
#include <system_error>

#include "steelyard/cli/commands.hpp"

namespace {

/// Writes everything to standard output; 0, or the error number.
int write_out(std::string_view text) {
    while (!text.empty()) {
        const ssize_t count = ::write(STDOUT_FILENO, text.data(), text.size());
        if (count < 0) {
            if (errno == EINTR) {
                continue;
            }
            return errno;
        }
        text.remove_prefix(static_cast<std::size_t>(count));
    }
    return 0;
}

}  // namespace

int main(int argc, char** argv) {
    // A reader that closes the pipe early (`| head`) has had what it wanted: that is no failure.
    std::signal(SIGPIPE, SIG_IGN);  // NOLINT(cert-err33-c)
    std::ostringstream out;
    const int code = steelyard::cli::run_program(argc, argv, out, std::cerr);
    const int error = write_out(out.str());
    if (error != 0 && error != EPIPE) {
        std::cerr << "steelyard: cannot write the result: " << std::generic_category().message(error) << '\n';
        return steelyard::cli::usage;
    }
    return code;
}
