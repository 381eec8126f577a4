// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/csv_text.hpp"

#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

/// visible(), but a line break stays one: inside quotes it is plain text.
std::string harmless(std::string_view text) {
    std::string result;
    while (true) {
        const std::size_t end = text.find('\n');
        const bool with_return = end != std::string_view::npos && end > 0 && text[end - 1] == '\r';
        result += visible(text.substr(0, with_return ? end - 1 : end));
        if (end == std::string_view::npos) {
            return result;
        }
        result += with_return ? "\r\n" : "\n";
        text.remove_prefix(end + 1);
    }
}

}  // namespace

std::string csv_field(std::string_view text) {
    constexpr std::string_view formula_starts = "=+-@\t\r";
    const bool formula = !text.empty() && formula_starts.find(text.front()) != std::string_view::npos;
    const std::string shown = (formula ? "'" : "") + harmless(text);
    if (shown.find_first_of(",\"\n") == std::string::npos) {
        return shown;
    }
    std::string quoted = "\"";
    for (const char c : shown) {
        quoted.append(c == '"' ? 2 : 1, c);
    }
    return quoted + '"';
}

}  // namespace steelyard::cli
