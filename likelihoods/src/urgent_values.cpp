// SPDX-License-Identifier: Apache-2.0
#include <algorithm>

#include "band_edges.hpp"
#include "decimals.hpp"
#include "steelyard/likelihoods/gate.hpp"
#include "steelyard/likelihoods/interval_words.hpp"

namespace steelyard::likelihoods {
namespace {

using detail::at_or_above;
using detail::strictly_above;

bool lies_beyond(const Interval& value, double limit, bool is_low) {
    return is_low ? !strictly_above(value.high, limit) : at_or_above(value.low, limit);
}

/// Whether some of the values it may have are at or beyond the limit.
bool reaches(const Interval& value, double limit, bool is_low) {
    if (is_low) {
        return value.low_open ? !at_or_above(value.low, limit) : !strictly_above(value.low, limit);
    }
    return value.high_open ? strictly_above(value.high, limit) : at_or_above(value.high, limit);
}

double reported_end(const Interval& value, bool is_low, bool certain) {
    if (value.low_is_floor || value.high_is_ceiling) {
        return value.low_is_floor ? value.high : value.low;
    }
    return is_low == certain ? value.high : value.low;
}

/// With at least the decimals of its limits, so that `below 2` stands as `below 2.0` beside 2.8.
std::string shown(const UrgentLimit& limit, const QuantityValue& quantity) {
    detail::Decimals decimals = detail::decimals_of(limit.quantity);
    for (const std::optional<double>& side : {limit.low, limit.high}) {
        decimals.least = std::max(decimals.least, side ? detail::decimals_needed(*side) : 0);
    }
    // What was entered is shown as it was; what was computed has no more to say than one decimal.
    decimals.most = quantity.origin == Origin::computed ? std::max(decimals.least, decimals.most) : 4;
    return interval_in_words(quantity.value,
                             [decimals](double value) { return detail::decimal(value, decimals); });
}

/// Takes out the lines of quantities that one other reported quantity alone was taken for.
void drop_restatements(const Quantities& quantities, std::vector<UrgentValue>& urgent) {
    const auto restates = [&](const UrgentValue& taken, const UrgentValue& original) {
        const QuantityValue& quantity = *quantities.find(taken.quantity);
        return quantity.origin == Origin::computed && quantity.from.size() == 1 &&
               quantity.from.front() == original.quantity && taken.is_low == original.is_low;
    };
    std::vector<bool> dropped(urgent.size(), false);
    for (std::size_t i = 0; i < urgent.size(); ++i) {
        for (std::size_t j = 0; j < urgent.size(); ++j) {
            if (restates(urgent[i], urgent[j])) {
                // The measured one stays, unless only the other is sure to be beyond its limit.
                dropped[urgent[i].certain && !urgent[j].certain ? j : i] = true;
            }
        }
    }
    std::vector<UrgentValue> kept;
    for (std::size_t i = 0; i < urgent.size(); ++i) {
        if (!dropped[i]) {
            kept.push_back(std::move(urgent[i]));
        }
    }
    urgent = std::move(kept);
}

}  // namespace

std::vector<UrgentValue> urgent_values(const Quantities& quantities, const std::vector<UrgentLimit>& limits) {
    std::vector<UrgentValue> urgent;
    for (const UrgentLimit& limit : limits) {
        const QuantityValue* quantity = quantities.find(limit.quantity);
        if (quantity == nullptr || (quantity->value.low_is_floor && quantity->value.high_is_ceiling)) {
            continue;
        }
        const Interval& value = quantity->value;
        const auto report = [&](const std::optional<double>& side, bool is_low) {
            if (!side || !reaches(value, *side, is_low)) {
                return;
            }
            const bool certain = lies_beyond(value, *side, is_low);
            urgent.push_back({limit.quantity, reported_end(value, is_low, certain), quantity->unit, *side,
                              is_low, limit.grounds, value, shown(limit, *quantity), certain});
        };
        report(limit.low, true);
        report(limit.high, false);
    }
    drop_restatements(quantities, urgent);
    return urgent;
}

}  // namespace steelyard::likelihoods
