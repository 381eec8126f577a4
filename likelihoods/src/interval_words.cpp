// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/interval_words.hpp"

#include <fmt/format.h>

#include <cmath>

namespace steelyard::likelihoods {

std::string interval_in_words(const Interval& value, const std::function<std::string(double)>& number,
                              std::string_view unit) {
    if (value.is_point()) {
        return fmt::format("{}{}", number(value.low), unit);
    }
    if (value.low_is_floor && value.high_is_ceiling) {
        return "not known";
    }
    if (value.low_is_floor) {
        return fmt::format("{} {}{}", value.high_open ? "below" : "at most", number(value.high), unit);
    }
    if (value.high_is_ceiling) {
        return value.low_open ? fmt::format("above {}{}", number(value.low), unit)
                              : fmt::format("{}{} or more", number(value.low), unit);
    }
    return fmt::format("{} to {}{}", number(value.low), number(value.high), unit);
}

std::string interval_in_words(const Interval& value, int digits) {
    return interval_in_words(value, [digits](double number) {
        const std::string text = fmt::format("{:.{}g}", number == 0.0 ? 0.0 : number, digits);
        // The general form turns to exponents early; clinicians read decimals.
        const bool large = text.find('e') != std::string::npos && std::abs(number) >= 1.0;
        return large ? fmt::format("{:.0f}", number) : text;
    });
}

}  // namespace steelyard::likelihoods
