// SPDX-License-Identifier: Apache-2.0
#pragma once
// A stream on a file descriptor that is written as it fills, and that remembers why it failed.

#include <array>
#include <ostream>
#include <streambuf>

namespace steelyard::cli {

class FdBuffer final : public std::streambuf {
  public:
    explicit FdBuffer(int descriptor);
    /// The error number of the first write that failed; 0 when none did.
    int error() const noexcept { return error_; }

  protected:
    int_type overflow(int_type c) override;
    std::streamsize xsputn(const char* text, std::streamsize count) override;
    int sync() override;

  private:
    bool write_out(const char* text, std::size_t count);

    int descriptor_;
    int error_ = 0;
    std::array<char, 65536> buffer_{};
};

}  // namespace steelyard::cli
