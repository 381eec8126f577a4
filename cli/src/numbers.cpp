// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/numbers.hpp"

#include <fmt/format.h>

#include <cmath>

#include "steelyard/engine/log_weight.hpp"
#include "steelyard/likelihoods/interval_words.hpp"
#include "steelyard/likelihoods/unit.hpp"

namespace steelyard::cli {

std::string percent(double probability) {
    const double value = 100.0 * probability;
    // Up to half a percent the honest word is "less than one"; the same at the other end.
    if (value <= 0.5) {
        return "<1 %";
    }
    if (value >= 99.5) {
        return ">99 %";
    }
    return fmt::format("{:.0f} %", value);
}

int supported_step(double low, double high) {
    const double width = high - low;
    if (width <= 0.05) {
        return 1;
    }
    return width <= 0.3 ? 5 : 10;
}

std::string percent_in_steps(double probability, int step) {
    const auto rounded = static_cast<int>(std::lround(100.0 * probability / step)) * step;
    if (rounded < step) {
        return fmt::format("<{} %", step);
    }
    if (rounded > 100 - step) {
        return fmt::format(">{} %", 100 - step);
    }
    return fmt::format("{} %", rounded);
}

std::string plain(double value, int digits) {
    // fmt's general form is shortest for its precision but turns to exponents early; clinicians read
    // decimals.
    std::string text = fmt::format("{:.{}g}", value, digits);
    if (text.find('e') == std::string::npos) {
        return text;
    }
    if (std::abs(value) >= 1.0 && std::abs(value) < 1e15) {
        return fmt::format("{:.0f}", value);
    }
    return text;
}

std::string signed_fixed(double value, int decimals) {
    std::string text = fmt::format("{:+.{}f}", value, decimals);
    const bool is_zero = text.find_first_not_of("+-0.") == std::string::npos;
    return is_zero ? text.substr(1) : text;
}

std::string in_words(const likelihoods::Interval& interval, int digits) {
    return likelihoods::interval_in_words(interval, [digits](double value) { return plain(value, digits); });
}

std::string unit_shown(std::string_view ucum) {
    const likelihoods::UnitReading reading = likelihoods::read_unit(ucum);
    if (!reading.unit) {
        return std::string(ucum);
    }
    if (reading.unit->dimension == likelihoods::Dimension::ph ||
        reading.unit->dimension == likelihoods::Dimension::ratio) {
        return {};
    }
    return std::string(reading.unit->shown);
}

double decibans(double nats) {
    return engine::LogWeight::nats(nats).to_decibans();
}

}  // namespace steelyard::cli
