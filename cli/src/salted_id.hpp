// SPDX-License-Identifier: Apache-2.0
#pragma once
// Case ids hidden from onlookers: the SHA-256 of a random salt and the id. Whoever has the salt can try ids
// one after the other, so a hash with its salt beside it protects from a glance, not from the holder of the
// file.

#include <cstddef>
#include <string>
#include <string_view>

namespace steelyard::cli {

inline constexpr std::size_t salt_bytes = 32;

/// Random bytes of the operating system. @throws std::system_error
std::string new_salt();

/// `sha256:` and 64 hexadecimal digits of the salt followed by the text.
std::string salted(std::string_view salt, std::string_view text);

}  // namespace steelyard::cli
