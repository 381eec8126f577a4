// SPDX-License-Identifier: Apache-2.0
#pragma once
// Results go to standard output or, with --out, to a file that appears whole or not at all.

#include <iosfwd>
#include <memory>
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

/// A result written piece by piece, whole or not at all: to `out` when the path is empty or `-`, else to a
/// file that has no name until it is finished, so that nothing is left of it if the program is stopped
/// before.
class ResultWriter {
  public:
    /// @throws OutputError
    ResultWriter(const std::string& path, std::ostream& out);
    ResultWriter(const ResultWriter&) = delete;
    ResultWriter& operator=(const ResultWriter&) = delete;
    ResultWriter(ResultWriter&&) = delete;
    ResultWriter& operator=(ResultWriter&&) = delete;
    ~ResultWriter();

    /// @throws OutputError
    void write(std::string_view text);
    /// Whether anybody still reads: false when standard output was closed, as by `| head`.
    bool wanted() const;
    /// Gives the file its name. Nothing is to be written afterwards. @throws OutputError
    void finish();

  private:
    class Target;
    std::unique_ptr<Target> file_;  ///< null: to the stream
    std::ostream* out_;
};

}  // namespace steelyard::cli
