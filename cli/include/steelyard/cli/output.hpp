// SPDX-License-Identifier: Apache-2.0
#pragma once
// Results go to standard output or, with --out, to a file that appears whole or not at all.

#include <iosfwd>
#include <stdexcept>
#include <string>
#include <string_view>

namespace steelyard::cli {

/// A result that could not be written, in words; exit code 2, since the place to write was the user's choice.
class OutputError : public std::runtime_error {
  public:
    using std::runtime_error::runtime_error;
};

/// Writes a result where the user wants it: to `out` when `path` is empty or `-`, else to the file, whole.
/// @throws OutputError
void write_result(const std::string& path, std::string_view text, std::ostream& out);

/// Replaces `path` by `text` through a temporary file beside it, so that a reader sees the old file or the
/// new one.
/// @throws OutputError  when the folder cannot be written or the disk is full
void write_whole(const std::string& path, std::string_view text);

}  // namespace steelyard::cli
