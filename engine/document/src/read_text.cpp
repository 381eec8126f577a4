// SPDX-License-Identifier: Apache-2.0
#include <fmt/format.h>

#include <array>
#include <cerrno>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <system_error>

#include "steelyard/document/node.hpp"

namespace steelyard::document {

namespace {
/// All of a stream, or one byte more than the limit when it holds more.
std::string read_up_to(std::istream& in, std::size_t limit) {
    std::string text;
    std::array<char, 65536> block{};
    while (text.size() <= limit && in) {
        const std::size_t wanted = std::min(block.size(), limit + 1 - text.size());
        in.read(block.data(), static_cast<std::streamsize>(wanted));
        text.append(block.data(), static_cast<std::size_t>(in.gcount()));
    }
    return text;
}

void unreadable(const std::string& path, std::string_view why, Diagnostics& faults) {
    faults.add({path, 0, 0}, Code::unreadable_file, fmt::format("the file cannot be read: {}", why));
}
}  // namespace

std::optional<std::string> read_text(const std::string& path, Diagnostics& faults, const Limits& limits) {
    std::string text;
    bool failed = false;
    if (path == "-") {
        text = read_up_to(std::cin, limits.bytes);
        failed = std::cin.bad();
    } else {
        std::error_code status;
        if (std::filesystem::is_directory(path, status)) {
            unreadable(path, "it is a folder", faults);
            return std::nullopt;
        }
        errno = 0;
        std::ifstream in(path, std::ios::binary);
        if (!in) {
            unreadable(path, std::generic_category().message(errno != 0 ? errno : ENOENT), faults);
            return std::nullopt;
        }
        text = read_up_to(in, limits.bytes);
        failed = in.bad();
    }
    if (failed) {
        unreadable(path, "reading failed part of the way", faults);
        return std::nullopt;
    }
    if (text.size() > limits.bytes) {
        faults.add({path, 0, 0}, Code::too_large,
                   fmt::format("the file has more than {} bytes", limits.bytes),
                   "split it into several files");
        return std::nullopt;
    }
    return text;
}

}  // namespace steelyard::document
