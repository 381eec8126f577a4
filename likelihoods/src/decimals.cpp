// SPDX-License-Identifier: Apache-2.0
#include "decimals.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "band_edges.hpp"
#include "steelyard/likelihoods/derived.hpp"
#include "steelyard/likelihoods/unit.hpp"

namespace steelyard::likelihoods::detail {
namespace {

bool meets(double value, double limit) {
    return at_or_above(value, limit) && !strictly_above(value, limit);
}

}  // namespace

Decimals decimals_of(std::string_view quantity) {
    if (quantity == "gfr") {
        return {0, 0};
    }
    if (const QuantityKind* kind = find_quantity(quantity)) {
        const std::optional<Unit> unit = read_unit(kind->unit).unit;
        if (unit && (unit->dimension == Dimension::ph || unit->dimension == Dimension::ratio)) {
            return {2, 2};
        }
    }
    return {0, 1};
}

int decimals_needed(double limit) {
    int needed = 0;
    double scale = 1.0;
    while (needed < 4 && !meets(std::round(limit * scale) / scale, limit)) {
        ++needed;
        scale *= 10.0;
    }
    return needed;
}

std::string decimal(double value, Decimals decimals) {
    std::string text = fmt::format("{:.{}f}", value, decimals.most);
    for (int written = decimals.most; written > decimals.least && text.back() == '0'; --written) {
        text.pop_back();
    }
    if (text.back() == '.') {
        text.pop_back();
    }
    const bool is_zero = text.find_first_not_of("-0.") == std::string::npos;
    return is_zero && text.front() == '-' ? text.substr(1) : text;
}

std::string decimal_beside(double value, double limit, Decimals decimals) {
    std::string text = decimal(value, decimals);
    if (meets(value, limit)) {
        return text;
    }
    for (int more = 1; more <= 3 && text == decimal(limit, decimals); ++more) {
        ++decimals.most;
        text = decimal(value, decimals);
    }
    return text;
}

}  // namespace steelyard::likelihoods::detail
