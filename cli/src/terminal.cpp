// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/terminal.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <cstdint>
#include <cstdlib>
#include <vector>

namespace steelyard::cli {
namespace {

/// Decodes one code point; invalid bytes come back as themselves with length 1 and the flag set.
struct Point {
    std::uint32_t value = 0;
    std::size_t length = 1;
    bool valid = true;
};

Point point_at(std::string_view text, std::size_t at) {
    const auto byte = [&](std::size_t i) {
        return static_cast<std::uint32_t>(static_cast<unsigned char>(text[i]));
    };
    const std::uint32_t lead = byte(at);
    if (lead < 0x80) {
        return {lead, 1, true};
    }
    std::size_t length = 0;
    std::uint32_t value = 0;
    if (lead >= 0xC2 && lead < 0xE0) {
        length = 2;
        value = lead & 0x1FU;
    } else if (lead >= 0xE0 && lead < 0xF0) {
        length = 3;
        value = lead & 0x0FU;
    } else if (lead >= 0xF0 && lead < 0xF5) {
        length = 4;
        value = lead & 0x07U;
    } else {
        return {lead, 1, false};
    }
    if (at + length > text.size()) {
        return {lead, 1, false};
    }
    for (std::size_t i = 1; i < length; ++i) {
        if ((byte(at + i) & 0xC0U) != 0x80U) {
            return {lead, 1, false};
        }
        value = (value << 6U) | (byte(at + i) & 0x3FU);
    }
    return {value, length, true};
}

/// Direction marks and other characters that change how their neighbours are shown.
bool changes_the_line(std::uint32_t point) {
    return (point >= 0x200B && point <= 0x200F) || (point >= 0x2028 && point <= 0x202E) ||
           (point >= 0x2060 && point <= 0x206F) || point == 0xFEFF || point == 0x061C;
}

std::vector<std::string_view> words_of(std::string_view text) {
    std::vector<std::string_view> words;
    std::size_t at = 0;
    while (at < text.size()) {
        const std::size_t start = text.find_first_not_of(' ', at);
        if (start == std::string_view::npos) {
            break;
        }
        const std::size_t end = text.find(' ', start);
        words.push_back(text.substr(start, end - start));
        at = end == std::string_view::npos ? text.size() : end;
    }
    return words;
}

/// The bytes of the first `width` code points.
std::size_t bytes_of(std::string_view text, std::size_t width) {
    std::size_t at = 0;
    for (std::size_t i = 0; i < width && at < text.size(); ++i) {
        at += point_at(text, at).length;
    }
    return at;
}

}  // namespace

std::string visible(std::string_view text) {
    std::string shown;
    shown.reserve(text.size());
    for (std::size_t at = 0; at < text.size();) {
        const Point point = point_at(text, at);
        if (!point.valid || point.value < 0x20 || (point.value >= 0x7F && point.value < 0xA0)) {
            shown += fmt::format("\\x{:02x}", point.value);
        } else if (changes_the_line(point.value)) {
            shown += fmt::format("\\u{:04x}", point.value);
        } else {
            shown += text.substr(at, point.length);
        }
        at += point.length;
    }
    return shown;
}

std::size_t text_width(std::string_view text) {
    std::size_t width = 0;
    for (std::size_t at = 0; at < text.size(); at += point_at(text, at).length) {
        ++width;
    }
    return width;
}

std::string padded(std::string_view text, std::size_t width) {
    const std::size_t used = text_width(text);
    return std::string(text) + std::string(used < width ? width - used : 0, ' ');
}

std::string padded_left(std::string_view text, std::size_t width) {
    const std::size_t used = text_width(text);
    return std::string(used < width ? width - used : 0, ' ') + std::string(text);
}

std::string wrapped(std::string_view text, std::string_view first, std::string_view rest, std::size_t width) {
    std::string result;
    std::string line(first);
    bool line_has_words = false;
    const auto end_line = [&] {
        result += line;
        result += '\n';
        line = rest;
        line_has_words = false;
    };
    for (std::string_view word : words_of(text)) {
        if (line_has_words && text_width(line) + 1 + text_width(word) > width) {
            end_line();
        }
        while (!line_has_words && text_width(line) + text_width(word) > width && text_width(line) < width) {
            const std::size_t bytes = bytes_of(word, width - text_width(line));
            line += word.substr(0, bytes);
            word = word.substr(bytes);
            end_line();
        }
        if (line_has_words) {
            line += ' ';
        }
        line += word;
        line_has_words = true;
    }
    result += line;
    result += '\n';
    return result;
}

bool wants_colour(Colour choice, int file_descriptor) {
    if (choice != Colour::automatic) {
        return choice == Colour::always;
    }
    const char* no_colour = std::getenv("NO_COLOR");  // NOLINT(concurrency-mt-unsafe): read once at the start
    const char* term = std::getenv("TERM");           // NOLINT(concurrency-mt-unsafe)
    const bool refused = no_colour != nullptr && *no_colour != '\0';
    const bool dumb = term == nullptr || std::string_view(term) == "dumb";
    return !refused && !dumb && isatty(file_descriptor) == 1;
}

std::string emphasised(std::string_view text, bool colour) {
    return colour ? "\x1b[1m" + std::string(text) + "\x1b[0m" : std::string(text);
}

std::string alarming(std::string_view text, bool colour) {
    return colour ? "\x1b[1;31m" + std::string(text) + "\x1b[0m" : std::string(text);
}

}  // namespace steelyard::cli
