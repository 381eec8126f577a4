// SPDX-License-Identifier: Apache-2.0
// Faults as a person reads them: place, sentence, the line with a caret under it, and the hint.
#include <fmt/format.h>

#include <algorithm>
#include <numeric>
#include <ostream>

#include "steelyard/document/diagnostic.hpp"
#include "utf8.hpp"

namespace steelyard::document {

namespace {
constexpr std::size_t widest_line = 100;  ///< display columns of a source line; longer ones are cut
constexpr std::size_t before_caret = 60;  ///< columns kept before the caret of a cut line
constexpr std::string_view tab =
    "    ";  ///< a tab is shown as four blanks, so that the caret stays under its place
constexpr std::string_view ellipsis = "...";

/// One character as shown.
struct Glyph {
    std::string shown;
    std::size_t width = 0;  ///< display columns: one a code point, or the length of the escape
};

Glyph glyph_at(std::string_view text, std::size_t& offset) {
    const std::size_t at = offset;
    const std::optional<detail::CodePoint> point = detail::code_point_at(text, at);
    if (!point) {
        ++offset;
        return {fmt::format("\\x{:02x}", static_cast<unsigned char>(text[at])), 4};
    }
    offset += point->length;
    if (point->value == '\t') {
        return {std::string(tab), tab.size()};
    }
    if (detail::is_control(point->value)) {
        return {fmt::format("\\x{:02x}", static_cast<unsigned>(point->value)), 4};
    }
    if (detail::disturbs_display(point->value)) {
        return {fmt::format("\\u{:04x}", static_cast<unsigned>(point->value)), 6};
    }
    return {std::string(text.substr(at, point->length)), 1};
}

/// Text of the input inside a message: nothing in it can move the cursor, change colours or start a new line.
std::string escaped(std::string_view text) {
    std::string shown;
    for (std::size_t offset = 0; offset < text.size();) {
        shown += glyph_at(text, offset).shown;
    }
    return shown;
}

struct Excerpt {
    std::string line;
    std::size_t caret = 0;  ///< display columns before the caret
};

std::size_t width_of(const std::vector<Glyph>& glyphs) {
    return std::accumulate(glyphs.begin(), glyphs.end(), std::size_t{0},
                           [](std::size_t sum, const Glyph& glyph) { return sum + glyph.width; });
}

/// The part of a line around a byte offset that fits the width. A line may hold megabytes: only bytes that
/// could be shown are looked at.
Excerpt excerpt(std::string_view line, std::size_t caret_offset) {
    caret_offset = std::min(caret_offset, line.size());
    constexpr std::size_t bytes_before = 4 * before_caret;  // a character has at most four
    std::size_t offset = caret_offset > bytes_before ? caret_offset - bytes_before : 0;
    bool cut_left = offset > 0;
    std::vector<Glyph> left, right;
    while (offset < caret_offset) {
        left.push_back(glyph_at(line, offset));
    }
    if (offset > caret_offset) {  // a place inside a character belongs to all of it
        right.push_back(left.back());
        left.pop_back();
    }
    while (offset < line.size() && width_of(right) <= widest_line) {
        right.push_back(glyph_at(line, offset));
    }
    bool cut_right = offset < line.size();
    if (cut_left || cut_right || width_of(left) + width_of(right) > widest_line) {
        while (width_of(left) > before_caret) {
            left.erase(left.begin());
            cut_left = true;
        }
        while (right.size() > 1 && width_of(left) + width_of(right) > widest_line) {
            right.pop_back();
            cut_right = true;
        }
    }
    Excerpt result;
    const auto append = [&result](const std::vector<Glyph>& glyphs) {
        for (const Glyph& glyph : glyphs) {
            result.line += glyph.shown;
        }
    };
    result.line = cut_left ? ellipsis : std::string_view();
    result.caret = result.line.size() + width_of(left);
    append(left);
    append(right);
    result.line += cut_right ? ellipsis : std::string_view();
    return result;
}

void print_one(std::ostream& out, const Diagnostic& fault, std::string_view line, bool colour) {
    const std::string_view loud = colour ? "\x1b[1;31m" : "", quiet = colour ? "\x1b[0m" : "";
    SourcePosition where = fault.where;
    where.file = escaped(where.file);
    out << to_string(where) << ": " << loud << "error[" << to_string(fault.code) << ']' << quiet << ": "
        << escaped(fault.message) << '\n';
    if (!line.empty() && fault.where.column > 0) {
        const Excerpt shown = excerpt(line, static_cast<std::size_t>(fault.where.column) - 1);
        out << "  " << shown.line << "\n  " << std::string(shown.caret, ' ') << loud << '^' << quiet << '\n';
    }
    if (!fault.hint.empty()) {
        out << "  hint: " << escaped(fault.hint) << '\n';
    }
}
}  // namespace

void print(std::ostream& out, const Diagnostics& faults, bool colour) {
    for (const Diagnostic& fault : faults.sorted()) {
        print_one(out, fault,
                  fault.source_line.empty() ? faults.remembered_line(fault.where) : fault.source_line,
                  colour);
    }
}

}  // namespace steelyard::document
