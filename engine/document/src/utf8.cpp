// SPDX-License-Identifier: Apache-2.0
#include "utf8.hpp"

#include "steelyard/document/encoding.hpp"

namespace steelyard::document::detail {

namespace {
/// What the first byte promises: how many bytes follow and the smallest value that needs them.
struct Lead {
    std::size_t following = 0;
    char32_t bits = 0;
    char32_t least = 0;
};

std::optional<Lead> lead_of(unsigned char byte) noexcept {
    if (byte >= 0xC2 && byte <= 0xDF) {
        return Lead{1, byte & 0x1FU, 0x80};
    }
    if (byte >= 0xE0 && byte <= 0xEF) {
        return Lead{2, byte & 0x0FU, 0x800};
    }
    if (byte >= 0xF0 && byte <= 0xF4) {
        return Lead{3, byte & 0x07U, 0x10000};
    }
    return std::nullopt;
}
}  // namespace

std::optional<CodePoint> code_point_at(std::string_view text, std::size_t offset) noexcept {
    const auto first = static_cast<unsigned char>(text[offset]);
    if (first < 0x80) {
        return CodePoint{first, 1};
    }
    const std::optional<Lead> lead = lead_of(first);
    if (!lead || text.size() - offset <= lead->following) {
        return std::nullopt;
    }
    char32_t value = lead->bits;
    for (std::size_t i = 1; i <= lead->following; ++i) {
        const auto byte = static_cast<unsigned char>(text[offset + i]);
        if ((byte & 0xC0U) != 0x80U) {
            return std::nullopt;
        }
        value = (value << 6U) | (byte & 0x3FU);
    }
    if (value < lead->least || value > 0x10FFFF || (value >= 0xD800 && value <= 0xDFFF)) {
        return std::nullopt;
    }
    return CodePoint{value, lead->following + 1};
}

}  // namespace steelyard::document::detail

namespace steelyard::document {

bool is_utf8(std::string_view bytes) noexcept {
    std::size_t at = 0;
    while (at < bytes.size()) {
        const auto point = detail::code_point_at(bytes, at);
        if (!point) {
            return false;
        }
        at += point->length;
    }
    return true;
}

}  // namespace steelyard::document
