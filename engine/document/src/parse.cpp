// SPDX-License-Identifier: Apache-2.0
// What holds for both syntaxes: size, encoding, and which of the two a text is.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>

#include "steelyard/document/node.hpp"
#include "tree_builder.hpp"
#include "utf8.hpp"

namespace steelyard::document {

namespace {
SourcePosition position_at(std::string_view text, std::size_t offset, const std::string& file) {
    const std::string_view before = text.substr(0, offset);
    const auto lines = std::count(before.begin(), before.end(), '\n');
    const std::size_t last = before.rfind('\n');
    const std::size_t start = last == std::string_view::npos ? 0 : last + 1;
    return {file, static_cast<int>(lines) + 1, static_cast<int>(offset - start) + 1};
}

/// UTF-8 throughout, no control characters but tab and line ends: reports the first byte that is not so.
bool check_encoding(std::string_view text, const std::string& file, Diagnostics& faults) {
    for (std::size_t at = 0; at < text.size();) {
        const auto byte = static_cast<unsigned char>(text[at]);
        const bool line_end = byte == '\n' || (byte == '\r' && at + 1 < text.size() && text[at + 1] == '\n');
        if ((byte >= 0x20 && byte < 0x7F) || byte == '\t' || line_end) {
            ++at;
            continue;
        }
        const std::optional<detail::CodePoint> point = detail::code_point_at(text, at);
        if (point && !detail::is_control(point->value) && point->value != 0xFEFF) {
            at += point->length;
            continue;
        }
        std::string message, hint;
        if (!point) {
            message = fmt::format("the byte 0x{:02X} is not part of UTF-8 text", byte);
            hint = "save the file as UTF-8";
        } else if (byte == 0) {
            message = "a zero byte stands in the text";
            hint = "save the file as UTF-8, not UTF-16";
        } else if (byte == '\r') {
            message = "a carriage return without a line feed stands in the text";
            hint = "end lines with a line feed";
        } else if (point->value == 0xFEFF) {
            message = "a byte order mark stands inside the text";
            hint = "take the invisible character away";
        } else {
            message = fmt::format("the control character U+{:04X} stands in the text",
                                  static_cast<unsigned>(point->value));
            hint = "take the invisible character away";
        }
        faults.add(position_at(text, at, file), Code::bad_encoding, std::move(message), std::move(hint));
        return false;
    }
    return true;
}

bool ends_with_lower(std::string_view name, std::string_view ending) {
    return name.size() >= ending.size() &&
           std::equal(ending.begin(), ending.end(), name.end() - static_cast<std::ptrdiff_t>(ending.size()),
                      [](char a, char b) { return a == std::tolower(static_cast<unsigned char>(b)); });
}
}  // namespace

Syntax syntax_of(std::string_view file_name, std::string_view text) {
    if (ends_with_lower(file_name, ".json")) {
        return Syntax::json;
    }
    if (ends_with_lower(file_name, ".yaml") || ends_with_lower(file_name, ".yml")) {
        return Syntax::yaml;
    }
    text = detail::without_byte_order_mark(text);
    const std::size_t first = text.find_first_not_of(" \t\r\n");
    const bool bracket = first != std::string_view::npos && (text[first] == '{' || text[first] == '[');
    return bracket ? Syntax::json : Syntax::yaml;
}

std::optional<Node> parse(std::string_view text, const std::string& file, Syntax syntax, Diagnostics& faults,
                          const Limits& limits) {
    if (text.size() > limits.bytes) {
        faults.add({file, 0, 0}, Code::too_large,
                   fmt::format("the text has more than {} bytes", limits.bytes),
                   "split it into several files");
        return std::nullopt;
    }
    text = detail::without_byte_order_mark(text);
    faults.remember_text(file, text);
    if (!check_encoding(text, file, faults)) {
        return std::nullopt;
    }
    if (text.find_first_not_of(" \t\r\n") == std::string_view::npos) {
        faults.add({file, 1, 1}, Code::empty_document, "the text is empty");
        return std::nullopt;
    }
    detail::TreeBuilder tree(file, limits, faults);
    if (!(syntax == Syntax::json ? detail::parse_json(text, tree) : detail::parse_yaml(text, tree))) {
        return std::nullopt;
    }
    std::optional<Node> root = tree.take();
    if (root && root->kind == Kind::scalar && !root->quoted && root->text.empty()) {
        faults.add(root->where(), Code::empty_document, "the text holds no value");
        return std::nullopt;
    }
    return root;
}

}  // namespace steelyard::document
