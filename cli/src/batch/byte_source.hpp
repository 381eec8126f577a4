// SPDX-License-Identifier: Apache-2.0
#pragma once
// Bytes of a file or of standard input, unpacked on the way when they are packed with gzip or zstd. Which it
// is, is told from the first bytes, not from the name.

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <stdexcept>
#include <string>

namespace steelyard::cli {

/// A file that cannot be opened, read or unpacked: the reason in words, without the file's name.
class SourceError : public std::runtime_error {
  public:
    using std::runtime_error::runtime_error;
};

class ByteSource {
  public:
    virtual ~ByteSource() = default;
    ByteSource() = default;
    ByteSource(const ByteSource&) = delete;
    ByteSource& operator=(const ByteSource&) = delete;
    ByteSource(ByteSource&&) = delete;
    ByteSource& operator=(ByteSource&&) = delete;

    /// Fills a part of `into`, which is not empty. @returns how many bytes; 0 at the end  @throws SourceError
    virtual std::size_t read(std::span<char> into) = 0;
    /// How many bytes of the file itself have been taken: for progress.
    virtual std::uint64_t taken() const = 0;
};

/// @param path  `-` is standard input  @throws SourceError
std::unique_ptr<ByteSource> open_bytes(const std::string& path);

/// Size of a regular file; 0 of anything else.
std::uint64_t size_of_file(const std::string& path);

}  // namespace steelyard::cli
