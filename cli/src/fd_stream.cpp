// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/fd_stream.hpp"

#include <unistd.h>

#include <cerrno>

namespace steelyard::cli {

FdBuffer::FdBuffer(int descriptor) : descriptor_(descriptor) {
    setp(buffer_.data(), buffer_.data() + buffer_.size());
}

bool FdBuffer::write_out(const char* text, std::size_t count) {
    while (count > 0 && error_ == 0) {
        const ssize_t written = ::write(descriptor_, text, count);
        if (written >= 0) {
            text += written;
            count -= static_cast<std::size_t>(written);
        } else if (errno != EINTR) {
            error_ = errno;
        }
    }
    return error_ == 0;
}

int FdBuffer::sync() {
    const bool written = write_out(pbase(), static_cast<std::size_t>(pptr() - pbase()));
    setp(buffer_.data(), buffer_.data() + buffer_.size());
    return written ? 0 : -1;
}

FdBuffer::int_type FdBuffer::overflow(int_type c) {
    if (sync() != 0) {
        return traits_type::eof();
    }
    if (!traits_type::eq_int_type(c, traits_type::eof())) {
        sputc(traits_type::to_char_type(c));
    }
    return traits_type::not_eof(c);
}

std::streamsize FdBuffer::xsputn(const char* text, std::streamsize count) {
    if (count < epptr() - pptr()) {
        return std::streambuf::xsputn(text, count);
    }
    return sync() == 0 && write_out(text, static_cast<std::size_t>(count)) ? count : 0;
}

}  // namespace steelyard::cli
