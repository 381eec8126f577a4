// SPDX-License-Identifier: Apache-2.0
#include "wording.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

namespace steelyard::likelihoods::detail {

std::string unit_after_number(std::string_view ucum) {
    const std::optional<Unit> unit = read_unit(ucum).unit;
    if (!unit) {
        return ucum.empty() ? std::string() : fmt::format(" {}", ucum);
    }
    if (unit->dimension == Dimension::ph || unit->dimension == Dimension::ratio) {
        return {};
    }
    return fmt::format(" {}", unit->shown);
}

std::string shown(double value) {
    return fmt::format("{:.6g}", value == 0.0 ? 0.0 : value);
}

std::string shown(const Interval& value, std::string_view ucum) {
    const std::string unit = unit_after_number(ucum);
    if (value.is_point()) {
        return shown(value.low) + unit;
    }
    if (!std::isfinite(value.low)) {
        return fmt::format("{} {}{}", value.high_open ? "below" : "at most", shown(value.high), unit);
    }
    if (!std::isfinite(value.high)) {
        return fmt::format("{} {}{}", value.low_open ? "above" : "at least", shown(value.low), unit);
    }
    return fmt::format("between {} and {}{}", shown(value.low), shown(value.high), unit);
}

std::string in_sentence(std::string_view title) {
    std::string text(title);
    const auto is_lower = [](char c) { return c >= 'a' && c <= 'z'; };
    if (text.size() >= 2 && text[0] >= 'A' && text[0] <= 'Z' && is_lower(text[1])) {
        // `TmP/GFR` begins with a capital and a small letter too, but has a capital inside its first word.
        const std::string first = text.substr(0, text.find(' '));
        for (std::size_t i = 1; i < first.size(); ++i) {
            if (first[i] >= 'A' && first[i] <= 'Z') {
                return text;
            }
        }
        text[0] = static_cast<char>(text[0] - 'A' + 'a');
    }
    return text;
}

std::string level_in_words(std::string_view level) {
    std::string words(level);
    std::replace(words.begin(), words.end(), '_', ' ');
    return words;
}

std::string listed_in_words(const std::vector<std::string>& items) {
    std::string text;
    for (std::size_t i = 0; i < items.size(); ++i) {
        text += i == 0 ? "" : (i + 1 == items.size() ? " and " : ", ");
        text += items[i];
    }
    return text;
}

std::string count_in_words(std::size_t count) {
    constexpr std::array<std::string_view, 11> words = {"no",  "one",   "two",   "three", "four", "five",
                                                        "six", "seven", "eight", "nine",  "ten"};
    return count < words.size() ? std::string(words[count]) : fmt::format("{}", count);
}

}  // namespace steelyard::likelihoods::detail
