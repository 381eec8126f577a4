// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/output.hpp"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdio>
#include <ostream>
#include <stdexcept>
#include <system_error>
#include <vector>

namespace steelyard::cli {
namespace {

std::string reason(int error) {
    return std::generic_category().message(error);
}

/// Writes everything; 0, or the error number.
int write_fully(int descriptor, std::string_view text) {
    while (!text.empty()) {
        const ssize_t count = ::write(descriptor, text.data(), text.size());
        if (count >= 0) {
            text.remove_prefix(static_cast<std::size_t>(count));
        } else if (errno != EINTR) {
            return errno;
        }
    }
    return 0;
}

/// Owns a temporary file: closed, and removed unless it has been moved into place.
class TemporaryFile {
  public:
    explicit TemporaryFile(const std::string& beside)
        : name_(beside + ".XXXXXX"), descriptor_(mkstemp(name_.data())) {
        if (descriptor_ < 0) {
            throw OutputError(fmt::format("cannot write {}: {}", beside, reason(errno)));
        }
    }
    TemporaryFile(const TemporaryFile&) = delete;
    TemporaryFile& operator=(const TemporaryFile&) = delete;
    TemporaryFile(TemporaryFile&&) = delete;
    TemporaryFile& operator=(TemporaryFile&&) = delete;
    ~TemporaryFile() {
        if (descriptor_ >= 0) {
            close(descriptor_);
        }
        if (!moved_) {
            unlink(name_.c_str());
        }
    }

    void write_all(std::string_view text) {
        if (const int error = write_fully(descriptor_, text); error != 0) {
            throw OutputError(fmt::format("cannot write {}: {}", name_, reason(error)));
        }
        // mkstemp gives 0600; a result is readable as any file the user makes.
        const mode_t mask = umask(0);
        umask(mask);
        if (fchmod(descriptor_, 0666U & ~mask) != 0 || fsync(descriptor_) != 0) {
            throw OutputError(fmt::format("cannot write {}: {}", name_, reason(errno)));
        }
    }

    void move_to(const std::string& path) {
        if (std::rename(name_.c_str(), path.c_str()) != 0) {
            throw OutputError(fmt::format("cannot write {}: {}", path, reason(errno)));
        }
        moved_ = true;
    }

  private:
    std::string name_;
    int descriptor_;
    bool moved_ = false;
};

void write_to_device(const std::string& path, std::string_view text) {
    const int descriptor =
        ::open(path.c_str(), O_WRONLY | O_CLOEXEC);  // NOLINT(cppcoreguidelines-pro-type-vararg)
    if (descriptor < 0) {
        throw OutputError(fmt::format("cannot write {}: {}", path, reason(errno)));
    }
    int error = write_fully(descriptor, text);
    if (close(descriptor) != 0 && error == 0) {
        error = errno;
    }
    if (error != 0) {
        throw OutputError(fmt::format("cannot write {}: {}", path, reason(error)));
    }
}

}  // namespace

void write_result(const std::string& path, std::string_view text, std::ostream& out) {
    if (path.empty() || path == "-") {
        out << text;
    } else {
        write_whole(path, text);
    }
}

void write_whole(const std::string& path, std::string_view text) {
    // A device or a pipe cannot be replaced by renaming; it takes the text as it comes.
    struct stat status {};
    if (stat(path.c_str(), &status) == 0 && !S_ISREG(status.st_mode)) {
        if (S_ISDIR(status.st_mode)) {
            throw OutputError(fmt::format("cannot write {}: it is a folder", path));
        }
        write_to_device(path, text);
        return;
    }
    TemporaryFile file(path);
    file.write_all(text);
    file.move_to(path);
}

}  // namespace steelyard::cli
