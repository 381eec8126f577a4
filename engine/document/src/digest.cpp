// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/digest.hpp"

#include <nettle/sha2.h>

#include <algorithm>
#include <array>
#include <cstdint>

namespace steelyard::document {

namespace {
class Sha256 {
  public:
    Sha256() { sha256_init(&state_); }

    void update(std::string_view bytes) {
        // The same bytes under another type: the library takes unsigned ones.
        sha256_update(&state_, bytes.size(), reinterpret_cast<const std::uint8_t*>(bytes.data()));  // NOLINT
    }

    std::string hexadecimal() {
        std::array<std::uint8_t, SHA256_DIGEST_SIZE> bytes{};
        sha256_digest(&state_, bytes.size(), bytes.data());
        constexpr std::string_view digits = "0123456789abcdef";
        std::string text;
        for (const std::uint8_t byte : bytes) {
            text += digits[byte >> 4U];
            text += digits[byte & 15U];
        }
        return text;
    }

  private:
    sha256_ctx state_{};
};
}  // namespace

std::string digest(std::vector<NamedText> files) {
    std::sort(files.begin(), files.end());
    Sha256 sum;
    // The length before the bytes keeps two files apart from one file that holds both; a zero byte ends each
    // part.
    constexpr std::string_view end("\0", 1);
    for (const auto& [name, text] : files) {
        sum.update(name);
        sum.update(end);
        sum.update(std::to_string(text.size()));
        sum.update(end);
        sum.update(text);
    }
    return "sha256:" + sum.hexadecimal();
}

}  // namespace steelyard::document
