// SPDX-License-Identifier: Apache-2.0
#include "salted_id.hpp"

#include <nettle/sha2.h>
#include <sys/random.h>

#include <array>
#include <cerrno>
#include <cstdint>
#include <system_error>

namespace steelyard::cli {

std::string new_salt() {
    std::string salt(salt_bytes, '\0');
    // Up to 256 bytes come whole or not at all.
    if (getrandom(salt.data(), salt.size(), 0) != static_cast<ssize_t>(salt.size())) {
        throw std::system_error(errno, std::generic_category(), "no random numbers");
    }
    return salt;
}

std::string salted(std::string_view salt, std::string_view text) {
    sha256_ctx state{};
    sha256_init(&state);
    for (const std::string_view part : {salt, text}) {
        // The same bytes under another type: the library takes unsigned ones.
        sha256_update(&state, part.size(), reinterpret_cast<const std::uint8_t*>(part.data()));  // NOLINT
    }
    std::array<std::uint8_t, SHA256_DIGEST_SIZE> bytes{};
    sha256_digest(&state, bytes.size(), bytes.data());
    constexpr std::string_view digits = "0123456789abcdef";
    std::string hash = "sha256:";
    for (const std::uint8_t byte : bytes) {
        hash += digits[byte >> 4U];
        hash += digits[byte & 15U];
    }
    return hash;
}

}  // namespace steelyard::cli
