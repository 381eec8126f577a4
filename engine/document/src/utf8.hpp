// SPDX-License-Identifier: Apache-2.0
#pragma once
// One code point of UTF-8 at a time, strictly: overlong forms, surrogates and values above U+10FFFF are
// refused.

#include <cstddef>
#include <optional>
#include <string_view>

namespace steelyard::document::detail {

struct CodePoint {
    char32_t value = 0;
    std::size_t length = 0;  ///< bytes, 1 to 4
};

/// The code point that starts at `offset` (inside the text), or empty when the bytes there are not UTF-8.
std::optional<CodePoint> code_point_at(std::string_view text, std::size_t offset) noexcept;

/// C0 and C1 controls and DEL, tab and line ends included.
constexpr bool is_control(char32_t point) noexcept {
    return point < 0x20 || (point >= 0x7F && point <= 0x9F);
}

/// Invisible marks that reorder or break displayed text: line separators, direction marks, the byte order
/// mark.
constexpr bool disturbs_display(char32_t point) noexcept {
    return point == 0x2028 || point == 0x2029 || point == 0x200E || point == 0x200F || point == 0x061C ||
           (point >= 0x202A && point <= 0x202E) || (point >= 0x2066 && point <= 0x2069) || point == 0xFEFF;
}

/// The text without a byte order mark at its start.
constexpr std::string_view without_byte_order_mark(std::string_view text) noexcept {
    return text.starts_with("\xEF\xBB\xBF") ? text.substr(3) : text;
}

}  // namespace steelyard::document::detail
