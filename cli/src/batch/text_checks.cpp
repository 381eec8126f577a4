// SPDX-License-Identifier: Apache-2.0
#include "text_checks.hpp"

#include "steelyard/document/encoding.hpp"

namespace steelyard::cli {

TextFault text_fault(std::string_view bytes) {
    if (bytes.starts_with("\xFF\xFE") || bytes.starts_with("\xFE\xFF")) {
        return TextFault::utf16;
    }
    if (bytes.find('\0') != std::string_view::npos) {
        return TextFault::nul;
    }
    return document::is_utf8(bytes) ? TextFault::none : TextFault::not_utf8;
}

std::string_view text_fault_in_words(TextFault fault) {
    switch (fault) {
        case TextFault::none:
            break;
        case TextFault::nul:
            return "there is a NUL byte: this is no text";
        case TextFault::utf16:
            return "the text is in UTF-16";
        case TextFault::not_utf8:
            return "these bytes are not UTF-8";
    }
    return "";
}

bool is_plain_ascii(std::string_view bytes) {
    bool plain = true;
    for (const char c : bytes) {
        const auto byte = static_cast<unsigned char>(c);
        plain &= byte < 0x7F && byte != 0;  // without a branch, so that it runs many bytes at a time
    }
    return plain;
}

std::string_view without_blanks(std::string_view text) {
    const auto blank = [](char c) { return c == ' ' || c == '\t'; };
    if (text.empty() || (!blank(text.front()) && !blank(text.back()))) {
        return text;
    }
    const std::size_t first = text.find_first_not_of(" \t");
    if (first == std::string_view::npos) {
        return {};
    }
    return text.substr(first, text.find_last_not_of(" \t") - first + 1);
}

}  // namespace steelyard::cli
