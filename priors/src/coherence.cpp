// SPDX-License-Identifier: Apache-2.0
#include "coherence.hpp"

#include <fmt/format.h>

#include <cmath>

#include "steelyard/priors/odds.hpp"

namespace steelyard::priors::detail {

namespace {

/// A double-quoted YAML scalar: safe for any text, since every control character is escaped.
std::string quoted(std::string_view text) {
    std::string out = "\"";
    for (const char c : text) {
        const auto byte = static_cast<unsigned char>(c);
        if (c == '"' || c == '\\') {
            out += '\\';
            out += c;
        } else if (byte < 0x20U || byte == 0x7FU) {
            out += fmt::format("\\x{:02X}", static_cast<unsigned int>(byte));
        } else {
            out += c;
        }
    }
    return out + '"';
}

std::string range_yaml(const PriorCause& cause, double printed_odds) {
    if (!cause.range_low || !cause.range_high) {
        return {};
    }
    const std::string low = odds_text(*cause.range_low);
    const std::string high = odds_text(*cause.range_high);
    // Compared as printed, because the text is what will be read back.
    if (!(parse_odds(low).value_or(0.0) <= printed_odds && printed_odds <= parse_odds(high).value_or(0.0))) {
        return {};
    }
    return fmt::format(R"(, range: ["{}", "{}"])", low, high);
}

std::string grounds_yaml(const PriorCause& cause) {
    if (!cause.grounds) {
        return {};
    }
    std::string out = fmt::format(", basis: {}", document::to_string(cause.grounds->basis));
    const std::vector<std::string>& keys = cause.grounds->sources;
    if (keys.size() == 1) {
        return out + ", source: " + quoted(keys.front());
    }
    for (std::size_t i = 0; i < keys.size(); ++i) {
        out += (i == 0 ? ", source: [" : ", ") + quoted(keys[i]);
    }
    return keys.empty() ? out : out + "]";
}

}  // namespace

double probability_sum(const std::vector<PriorCause>& causes) {
    double sum = 0.0;
    for (const PriorCause& cause : causes) {
        sum += probability_of_odds(cause.given);
    }
    return sum;
}

bool coheres(double sum) noexcept {
    // A miss of exactly the tolerance is allowed; the last term is for its rounding.
    return std::abs(sum - 1.0) <= coherence_tolerance + 1e-12;
}

std::string nearest_coherent_yaml(const std::vector<PriorCause>& causes) {
    const double sum = probability_sum(causes);
    std::string out = "causes: {";
    for (std::size_t i = 0; i < causes.size(); ++i) {
        const PriorCause& cause = causes[i];
        const std::string odds = odds_text(odds_of_probability(probability_of_odds(cause.given) / sum));
        out += fmt::format("{}{}: {{odds: \"{}\"", i == 0 ? "" : ", ", cause.id, odds);
        out += range_yaml(cause, parse_odds(odds).value_or(0.0));
        out += grounds_yaml(cause);
        if (!cause.note.empty()) {
            out += ", note: " + quoted(cause.note);
        }
        out += '}';
    }
    return out + '}';
}

}  // namespace steelyard::priors::detail
