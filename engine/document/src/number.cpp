// SPDX-License-Identifier: Apache-2.0
// Numbers from text: std::from_chars over the whole text, so that neither the locale nor YAML's own notations
// (octal, .inf, .nan, 1_000) have a say.
#include <fmt/format.h>

#include <charconv>
#include <cmath>

#include "steelyard/document/strict_map.hpp"

namespace steelyard::document {

namespace {
struct Conversion {
    double value = 0.0;
    std::errc status =
        std::errc::invalid_argument;  ///< errc{} when all of the text is a number, infinite or NaN too
};

Conversion convert(std::string_view text) noexcept {
    if (text.starts_with('+')) {
        text.remove_prefix(1);
        if (text.starts_with('-')) {
            return {};
        }
    }
    Conversion result;
    const char* end = text.data() + text.size();
    const auto [stop, status] = std::from_chars(text.data(), end, result.value);
    result.status = status == std::errc{} && stop != end ? std::errc::invalid_argument : status;
    if (status == std::errc::result_out_of_range && stop != end) {
        result.status = std::errc::invalid_argument;
    }
    return result;
}

/// `.nan`, `-.inf` and the like: numbers to YAML, not to us.
bool is_not_finite_word(std::string_view text) noexcept {
    if (text.starts_with('+') || text.starts_with('-')) {
        text.remove_prefix(1);
    }
    return text == ".nan" || text == ".NaN" || text == ".NAN" || text == ".inf" || text == ".Inf" ||
           text == ".INF";
}

/// What a person most likely meant by a text that is no number.
std::string number_hint(const Node& node) {
    if (node.quoted && number_from(node.text)) {
        return "take away the quotes";
    }
    std::string with_point = node.text;
    if (const auto comma = with_point.find(','); comma != std::string::npos) {
        with_point[comma] = '.';
        if (number_from(with_point)) {
            return "the decimal mark is a point, and thousands are not grouped";
        }
    }
    return {};
}

std::string range_text(double low, double high) {
    if (std::isinf(high)) {
        return fmt::format("at least {}", low);
    }
    if (std::isinf(low)) {
        return fmt::format("at most {}", high);
    }
    return fmt::format("between {} and {}", low, high);
}
}  // namespace

std::optional<double> number_from(std::string_view text) noexcept {
    const Conversion result = convert(text);
    if (result.status != std::errc{} || !std::isfinite(result.value)) {
        return std::nullopt;
    }
    return result.value;
}

std::optional<double> read_number(const Node& node, std::string_view what, Diagnostics& faults, double low,
                                  double high) {
    if (node.kind != Kind::scalar) {
        faults.add(node.where(), Code::not_a_number,
                   fmt::format("{} is a {}, but must be a number", what,
                               node.kind == Kind::sequence ? "list" : "mapping"));
        return std::nullopt;
    }
    if (node.quoted) {
        faults.add(node.where(), Code::not_a_number,
                   fmt::format("{} is the text \"{}\", but must be a number", what, node.text),
                   number_hint(node));
        return std::nullopt;
    }
    const Conversion result = convert(node.text);
    if (is_not_finite_word(node.text) || (result.status == std::errc{} && !std::isfinite(result.value))) {
        faults.add(node.where(), Code::not_finite,
                   fmt::format("{} is {}, but must be a finite number", what, node.text));
        return std::nullopt;
    }
    if (result.status == std::errc::result_out_of_range) {
        faults.add(node.where(), Code::out_of_range,
                   fmt::format("{} is {}, which is too large or too close to zero to be held exactly enough",
                               what, node.text));
        return std::nullopt;
    }
    if (result.status != std::errc{}) {
        faults.add(node.where(), Code::not_a_number,
                   node.is_null() ? fmt::format("{} is empty, but must be a number", what)
                                  : fmt::format("{} is \"{}\", but must be a number", what, node.text),
                   number_hint(node));
        return std::nullopt;
    }
    if (!(low <= result.value && result.value <= high)) {
        faults.add(node.where(), Code::out_of_range,
                   fmt::format("{} is {}, but must be {}", what, node.text, range_text(low, high)));
        return std::nullopt;
    }
    return result.value;
}

std::optional<std::vector<double>> read_numbers(const Node& node, std::string_view what, Diagnostics& faults,
                                                double low, double high) {
    if (node.kind != Kind::sequence) {
        faults.add(node.where(), Code::wrong_type, fmt::format("{} must be a list of numbers", what),
                   "write the numbers in brackets, [1, 2]");
        return std::nullopt;
    }
    std::vector<double> values;
    bool sound = true;
    for (std::size_t i = 0; i < node.items.size(); ++i) {
        const std::optional<double> value =
            read_number(node.items[i], fmt::format("{}[{}]", what, i + 1), faults, low, high);
        sound = sound && value;
        values.push_back(value.value_or(0.0));
    }
    return sound ? std::optional(std::move(values)) : std::nullopt;
}

}  // namespace steelyard::document
