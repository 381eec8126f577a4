// SPDX-License-Identifier: Apache-2.0
#include "steelyard/priors/odds.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "steelyard/document/strict_map.hpp"

namespace steelyard::priors {

namespace {

std::string_view trimmed(std::string_view text) noexcept {
    while (!text.empty() && text.front() == ' ') {
        text.remove_prefix(1);
    }
    while (!text.empty() && text.back() == ' ') {
        text.remove_suffix(1);
    }
    return text;
}

/// Three significant digits of a number >= 1, without an exponent: 3.4, 24, 1230000.
std::string three_digits(double number) {
    std::string rounded = fmt::format("{:.3g}", number);
    if (rounded.find('e') == std::string::npos) {
        return rounded;
    }
    return fmt::format("{:.0f}", document::number_from(rounded).value_or(number));
}

}  // namespace

std::optional<double> parse_odds(std::string_view text) noexcept {
    const std::size_t colon = text.find(':');
    const std::optional<double> first = document::number_from(trimmed(text.substr(0, colon)));
    const std::optional<double> second =
        colon == std::string_view::npos ? 1.0 : document::number_from(trimmed(text.substr(colon + 1)));
    if (!first || !second || !(*first > 0.0) || !(*second > 0.0)) {
        return std::nullopt;
    }
    const double odds = *first / *second;
    if (!(odds >= least_given && odds <= most_given)) {
        return std::nullopt;
    }
    return odds;
}

double probability_of_odds(double odds) noexcept {
    return odds / (1.0 + odds);
}

double odds_of_probability(double probability) noexcept {
    return probability / (1.0 - probability);
}

std::string odds_text(double odds) {
    const double within = std::clamp(odds, least_given, most_given);
    return within < 1.0 ? "1:" + three_digits(1.0 / within) : three_digits(within) + ":1";
}

}  // namespace steelyard::priors
