// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/output.hpp"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstdio>
#include <optional>
#include <ostream>
#include <sstream>
#include <stdexcept>
#include <system_error>
#include <utility>

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

/// A file that takes its name only when it is whole. Where the system allows it has no name before, so that
/// nothing remains of it when the program is stopped; elsewhere it has a temporary one, and is removed.
class UnnamedFile {
  public:
    explicit UnnamedFile(const std::string& path) : path_(path) {
        const std::size_t slash = path.rfind('/');
        const std::string folder =
            slash == std::string::npos ? "." : path.substr(0, std::max<std::size_t>(slash, 1));
        // NOLINTNEXTLINE(cppcoreguidelines-pro-type-vararg)
        descriptor_ = ::open(folder.c_str(), O_TMPFILE | O_RDWR | O_CLOEXEC, 0600);
        if (descriptor_ < 0) {
            name_ = path + ".XXXXXX";
            descriptor_ = mkstemp(name_.data());
        }
        if (descriptor_ < 0) {
            throw OutputError(fmt::format("cannot write {}: {}", path, reason(errno)));
        }
    }
    UnnamedFile(const UnnamedFile&) = delete;
    UnnamedFile& operator=(const UnnamedFile&) = delete;
    UnnamedFile(UnnamedFile&&) = delete;
    UnnamedFile& operator=(UnnamedFile&&) = delete;
    ~UnnamedFile() {
        close(descriptor_);
        if (!name_.empty()) {
            unlink(name_.c_str());
        }
    }

    void write(std::string_view text) { check(write_fully(descriptor_, text)); }

    void take_name() {
        // A result is readable as any file the user makes.
        const mode_t mask = umask(0);
        umask(mask);
        check(fchmod(descriptor_, 0666U & ~mask) != 0 || fsync(descriptor_) != 0 ? errno : 0);
        if (name_.empty()) {
            link_beside();
        }
        check(std::rename(name_.c_str(), path_.c_str()) != 0 ? errno : 0);
        name_.clear();
    }

  private:
    void check(int error) const {
        if (error != 0) {
            throw OutputError(fmt::format("cannot write {}: {}", path_, reason(error)));
        }
    }

    /// A file without a name cannot replace one that has it; it gets a name of its own first.
    void link_beside() {
        const std::string itself = fmt::format("/proc/self/fd/{}", descriptor_);
        for (int attempt = 0;; ++attempt) {
            std::string beside = fmt::format("{}.{}-{}", path_, getpid(), attempt);
            if (linkat(AT_FDCWD, itself.c_str(), AT_FDCWD, beside.c_str(), AT_SYMLINK_FOLLOW) == 0) {
                name_ = std::move(beside);
                return;
            }
            check(errno != EEXIST || attempt == 100 ? errno : 0);
        }
    }

    std::string path_;
    std::string name_;  ///< of the temporary file; empty while it has none
    int descriptor_ = -1;
};

/// A device or a pipe: it cannot be replaced by renaming and takes the text as it comes.
class Device {
  public:
    explicit Device(const std::string& path)
        // NOLINTNEXTLINE(cppcoreguidelines-pro-type-vararg)
        : path_(path), descriptor_(::open(path.c_str(), O_WRONLY | O_CLOEXEC)) {
        check(descriptor_ < 0 ? errno : 0);
    }
    Device(const Device&) = delete;
    Device& operator=(const Device&) = delete;
    Device(Device&&) = delete;
    Device& operator=(Device&&) = delete;
    ~Device() {
        if (descriptor_ >= 0) {
            close(descriptor_);
        }
    }

    void write(std::string_view text) const { check(write_fully(descriptor_, text)); }
    void finish() { check(close(std::exchange(descriptor_, -1)) != 0 ? errno : 0); }

  private:
    void check(int error) const {
        if (error != 0) {
            throw OutputError(fmt::format("cannot write {}: {}", path_, reason(error)));
        }
    }
    std::string path_;
    int descriptor_;
};

}  // namespace

void write_result(const std::string& path, std::string_view text, std::ostream& out) {
    if (path.empty() || path == "-") {
        out << text;
    } else {
        write_whole(path, text);
    }
}

void write_whole(const std::string& path, std::string_view text) {
    std::ostringstream unused;
    ResultWriter writer(path, unused);
    writer.write(text);
    writer.finish();
}

class ResultWriter::Target {
  public:
    explicit Target(const std::string& path) {
        struct stat status {};
        const bool there = stat(path.c_str(), &status) == 0;
        if (there && S_ISDIR(status.st_mode)) {
            throw OutputError(fmt::format("cannot write {}: it is a folder", path));
        }
        if (there && !S_ISREG(status.st_mode)) {
            device_.emplace(path);
        } else {
            file_.emplace(path);
        }
    }
    void write(std::string_view text) {
        if (device_) {
            device_->write(text);
        } else {
            file_->write(text);
        }
    }
    void finish() {
        if (device_) {
            device_->finish();
        } else {
            file_->take_name();
        }
    }

  private:
    std::optional<UnnamedFile> file_;
    std::optional<Device> device_;
};

ResultWriter::ResultWriter(const std::string& path, std::ostream& out)
    : file_(path.empty() || path == "-" ? nullptr : std::make_unique<Target>(path)), out_(&out) {}

ResultWriter::~ResultWriter() = default;

void ResultWriter::write(std::string_view text) {
    if (file_) {
        file_->write(text);
    } else {
        out_->write(text.data(), static_cast<std::streamsize>(text.size()));
    }
}

bool ResultWriter::wanted() const {
    return file_ || out_->good();
}

void ResultWriter::finish() {
    if (file_) {
        file_->finish();
    } else {
        out_->flush();
    }
}

}  // namespace steelyard::cli
