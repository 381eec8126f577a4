// SPDX-License-Identifier: Apache-2.0
#include "byte_source.hpp"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>
#include <zlib.h>
#include <zstd.h>

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <string_view>
#include <system_error>
#include <utility>
#include <vector>

namespace steelyard::cli {
namespace {

constexpr std::size_t packed_block = std::size_t{256} * 1024;

/// A file as it lies on the disk, of which the first bytes can be looked at.
class PlainBytes final : public ByteSource {
  public:
    explicit PlainBytes(const std::string& path) {
        if (path == "-") {
            descriptor_ = STDIN_FILENO;
            return;
        }
        struct stat status {};
        if (stat(path.c_str(), &status) == 0 && S_ISDIR(status.st_mode)) {
            throw SourceError("it is a folder");
        }
        descriptor_ =
            ::open(path.c_str(), O_RDONLY | O_CLOEXEC);  // NOLINT(cppcoreguidelines-pro-type-vararg)
        if (descriptor_ < 0) {
            throw SourceError(std::generic_category().message(errno));
        }
    }
    PlainBytes(const PlainBytes&) = delete;
    PlainBytes& operator=(const PlainBytes&) = delete;
    PlainBytes(PlainBytes&&) = delete;
    PlainBytes& operator=(PlainBytes&&) = delete;
    ~PlainBytes() override {
        if (descriptor_ > STDIN_FILENO) {
            ::close(descriptor_);
        }
    }

    /// The first bytes, up to `count`; they are read again afterwards.
    std::string_view peek(std::size_t count) {
        while (peeked_.size() < count) {
            std::vector<char> more(count - peeked_.size());
            const std::size_t got = read_file(more);
            if (got == 0) {
                break;
            }
            peeked_.append(more.data(), got);
        }
        return peeked_;
    }

    std::size_t read(std::span<char> into) override {
        if (!peeked_.empty()) {
            const std::size_t count = std::min(into.size(), peeked_.size());
            std::memcpy(into.data(), peeked_.data(), count);
            peeked_.erase(0, count);
            return count;
        }
        return read_file(into);
    }

    std::uint64_t taken() const override { return taken_; }

  private:
    std::size_t read_file(std::span<char> into) {
        while (true) {
            const ssize_t count = ::read(descriptor_, into.data(), into.size());
            if (count >= 0) {
                taken_ += static_cast<std::uint64_t>(count);
                return static_cast<std::size_t>(count);
            }
            if (errno != EINTR) {
                throw SourceError(std::generic_category().message(errno));
            }
        }
    }

    int descriptor_ = -1;
    std::string peeked_;
    std::uint64_t taken_ = 0;
};

/// gzip, of one or several members (RFC 1952).
class GzipBytes final : public ByteSource {
  public:
    explicit GzipBytes(std::unique_ptr<PlainBytes> file) : file_(std::move(file)), packed_(packed_block) {
        constexpr int gzip_only = 16 + MAX_WBITS;
        if (inflateInit2(&stream_, gzip_only) != Z_OK) {
            throw std::bad_alloc();
        }
    }
    GzipBytes(const GzipBytes&) = delete;
    GzipBytes& operator=(const GzipBytes&) = delete;
    GzipBytes(GzipBytes&&) = delete;
    GzipBytes& operator=(GzipBytes&&) = delete;
    ~GzipBytes() override { inflateEnd(&stream_); }

    std::size_t read(std::span<char> into) override {
        stream_.next_out = as_bytes(into.data());
        stream_.avail_out = static_cast<uInt>(std::min<std::size_t>(into.size(), packed_block));
        const uInt wanted = stream_.avail_out;
        while (stream_.avail_out == wanted) {
            if (stream_.avail_in == 0) {
                const std::size_t count = file_->read(packed_);
                if (count == 0) {
                    if (inside_member_) {
                        throw SourceError("the gzip data end in the middle: the file is not whole");
                    }
                    return 0;
                }
                stream_.next_in = as_bytes(packed_.data());
                stream_.avail_in = static_cast<uInt>(count);
            }
            if (!inside_member_) {
                inflateReset(&stream_);
                inside_member_ = true;
            }
            const int result = inflate(&stream_, Z_NO_FLUSH);
            if (result == Z_STREAM_END) {
                inside_member_ = false;
            } else if (result != Z_OK && result != Z_BUF_ERROR) {
                throw SourceError(fmt::format("the gzip data are damaged ({})",
                                              stream_.msg != nullptr ? stream_.msg : "unknown reason"));
            }
        }
        return wanted - stream_.avail_out;
    }

    std::uint64_t taken() const override { return file_->taken(); }

  private:
    static Bytef* as_bytes(char* text) {
        return reinterpret_cast<Bytef*>(text);  // NOLINT(cppcoreguidelines-pro-type-reinterpret-cast): zlib
    }

    std::unique_ptr<PlainBytes> file_;
    std::vector<char> packed_;
    z_stream stream_{};
    bool inside_member_ = false;
};

/// Zstandard, of one or several frames (RFC 8878).
class ZstdBytes final : public ByteSource {
  public:
    explicit ZstdBytes(std::unique_ptr<PlainBytes> file)
        : file_(std::move(file)), packed_(packed_block), stream_(ZSTD_createDStream(), &ZSTD_freeDStream) {
        if (!stream_) {
            throw std::bad_alloc();
        }
        // Windows above 32 MiB would be the sender's way to take our memory.
        constexpr int largest_window = 25;
        ZSTD_DCtx_setParameter(stream_.get(), ZSTD_d_windowLogMax, largest_window);
    }

    std::size_t read(std::span<char> into) override {
        ZSTD_outBuffer out{into.data(), into.size(), 0};
        while (out.pos == 0) {
            if (in_.pos == in_.size) {
                in_ = {packed_.data(), file_->read(packed_), 0};
                if (in_.size == 0) {
                    if (inside_frame_) {
                        throw SourceError("the zstd data end in the middle: the file is not whole");
                    }
                    return 0;
                }
            }
            const std::size_t hint = ZSTD_decompressStream(stream_.get(), &out, &in_);
            if (ZSTD_isError(hint) != 0) {
                throw SourceError(fmt::format("the zstd data are damaged ({})", ZSTD_getErrorName(hint)));
            }
            inside_frame_ = hint != 0;
        }
        return out.pos;
    }

    std::uint64_t taken() const override { return file_->taken(); }

  private:
    std::unique_ptr<PlainBytes> file_;
    std::vector<char> packed_;
    std::unique_ptr<ZSTD_DStream, decltype(&ZSTD_freeDStream)> stream_;
    ZSTD_inBuffer in_{nullptr, 0, 0};
    bool inside_frame_ = false;
};

}  // namespace

std::unique_ptr<ByteSource> open_bytes(const std::string& path) {
    auto file = std::make_unique<PlainBytes>(path);
    const std::string_view first = file->peek(4);
    if (first.starts_with("\x1f\x8b")) {
        return std::make_unique<GzipBytes>(std::move(file));
    }
    if (first.starts_with("\x28\xb5\x2f\xfd")) {
        return std::make_unique<ZstdBytes>(std::move(file));
    }
    return file;
}

std::uint64_t size_of_file(const std::string& path) {
    struct stat status {};
    return path != "-" && stat(path.c_str(), &status) == 0 && S_ISREG(status.st_mode)
               ? static_cast<std::uint64_t>(status.st_size)
               : 0;
}

}  // namespace steelyard::cli
