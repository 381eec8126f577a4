// SPDX-License-Identifier: Apache-2.0
#include "entry_text.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <cstddef>
#include <system_error>

namespace steelyard::likelihoods::detail {
namespace {

constexpr std::string_view no_break_space = "\xC2\xA0";

bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

struct ComparatorSign {
    std::string_view text;
    Comparator comparator;
};
// Two-character signs first, so that `<=` is not read as `<`.
constexpr auto signs = std::to_array<ComparatorSign>({
    {"<=", Comparator::at_most},
    {">=", Comparator::at_least},
    {"\xE2\x89\xA4", Comparator::at_most},   // U+2264
    {"\xE2\x89\xA5", Comparator::at_least},  // U+2265
    {"<", Comparator::less},
    {">", Comparator::greater},
});

Comparator take_comparator(std::string_view& text) {
    const auto* const sign =
        std::find_if(signs.begin(), signs.end(), [&](const auto& s) { return text.starts_with(s.text); });
    if (sign == signs.end()) {
        return Comparator::none;
    }
    text = trimmed(text.substr(sign->text.size()));
    return sign->comparator;
}

/// How many characters at the front of a text make a decimal number, `2.8`, `-3`, `1e-3`; 0 when none do.
std::size_t number_length(std::string_view text) {
    std::size_t i = !text.empty() && (text.front() == '+' || text.front() == '-') ? 1 : 0;
    std::size_t digits = 0;
    for (; i < text.size() && is_digit(text[i]); ++i) {
        ++digits;
    }
    if (i < text.size() && text[i] == '.') {
        for (++i; i < text.size() && is_digit(text[i]); ++i) {
            ++digits;
        }
    }
    if (digits == 0) {
        return 0;
    }
    if (i < text.size() && (text[i] == 'e' || text[i] == 'E')) {
        std::size_t j = i + 1;
        if (j < text.size() && (text[j] == '+' || text[j] == '-')) {
            ++j;
        }
        if (j < text.size() && is_digit(text[j])) {
            while (j < text.size() && is_digit(text[j])) {
                ++j;
            }
            i = j;
        }
    }
    return i;
}

/// `nan`, `inf`, `infinity`, with a sign or the leading dot of YAML, in any case.
bool names_no_finite_number(std::string_view text) {
    if (!text.empty() && (text.front() == '+' || text.front() == '-')) {
        text.remove_prefix(1);
    }
    if (!text.empty() && text.front() == '.') {
        text.remove_prefix(1);
    }
    std::string word;
    for (const char c : text) {
        const bool upper = c >= 'A' && c <= 'Z';
        const bool lower = c >= 'a' && c <= 'z';
        if (!upper && !lower) {
            break;
        }
        word += upper ? static_cast<char>(c - 'A' + 'a') : c;
    }
    return word == "nan" || word == "inf" || word == "infinity";
}

}  // namespace

std::string_view trimmed(std::string_view text) {
    const auto take = [&](auto&& starts, auto&& remove) {
        while (!text.empty() && starts()) {
            remove();
        }
    };
    const auto blank = [](char c) { return c == ' ' || c == '\t'; };
    take([&] { return blank(text.front()) || text.starts_with(no_break_space); },
         [&] { text.remove_prefix(blank(text.front()) ? 1 : no_break_space.size()); });
    take([&] { return blank(text.back()) || text.ends_with(no_break_space); },
         [&] { text.remove_suffix(blank(text.back()) ? 1 : no_break_space.size()); });
    return text;
}

bool read_entry_text(std::string_view text, EntryText& entry, EntryFault& fault) {
    const std::string_view all = trimmed(text);
    std::string_view rest = all;
    entry.comparator = take_comparator(rest);
    const std::size_t length = number_length(rest);
    if (length == 0) {
        if (names_no_finite_number(rest)) {
            fault = {document::Code::not_finite, fmt::format("\"{}\" is not a finite number", all),
                     "leave the entry out when the value is not known"};
        } else {
            fault = {document::Code::not_a_number, fmt::format("\"{}\" does not begin with a number", all),
                     "write a number and a unit, as in: 2.8 mmol/L"};
        }
        return false;
    }
    const std::string_view written = rest.substr(0, length);
    const std::string_view after = rest.substr(length);
    std::string_view unit = trimmed(after);
    if (after.starts_with(',')) {
        std::string with_point(written);
        with_point += '.';
        for (std::size_t i = 1; i < after.size() && is_digit(after[i]); ++i) {
            with_point += after[i];
        }
        fault = {document::Code::not_a_number, fmt::format("\"{}\" has a comma in its number", all),
                 fmt::format("the decimal sign is a point, and thousands are not parted: {}", with_point)};
        return false;
    }
    // A lone `1` after a blank is the UCUM code of a plain number; any other second number makes the text a
    // range, a date or a slip.
    const bool plain_number_unit = unit == "1" && after.front() != '1';
    if (!unit.empty() && !plain_number_unit &&
        (is_digit(unit.front()) || unit.front() == '.' || unit.front() == '-' || unit.front() == '+')) {
        fault = {document::Code::not_a_number, fmt::format("\"{}\" is not one number", all),
                 "write one number and a unit, as in: 2.8 mmol/L"};
        return false;
    }
    const std::string_view digits = written.front() == '+' ? written.substr(1) : written;
    const auto [end, error] = std::from_chars(digits.data(), digits.data() + digits.size(), entry.number);
    if (error == std::errc::result_out_of_range) {
        fault = {document::Code::not_finite,
                 fmt::format("\"{}\" is too large or too small for a number", all), ""};
        return false;
    }
    if (error != std::errc() || end != digits.data() + digits.size()) {
        fault = {document::Code::not_a_number, fmt::format("\"{}\" is not a number", written), ""};
        return false;
    }
    entry.as_read = all.substr(0, static_cast<std::size_t>(written.data() + written.size() - all.data()));
    entry.unit = unit;
    return true;
}

}  // namespace steelyard::likelihoods::detail
