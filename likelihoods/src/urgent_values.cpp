// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/gate.hpp"

namespace steelyard::likelihoods {

std::vector<UrgentValue> urgent_values(const Quantities& quantities, const std::vector<UrgentLimit>& limits) {
    std::vector<UrgentValue> urgent;
    for (const UrgentLimit& limit : limits) {
        const QuantityValue* quantity = quantities.find(limit.quantity);
        if (quantity == nullptr) {
            continue;
        }
        // Of a censored value the end nearest the limit is reported: the least urgent value it may have.
        const Interval& value = quantity->value;
        if (limit.low && value.high <= *limit.low) {
            urgent.push_back({limit.quantity, value.high, quantity->unit, *limit.low, true, limit.grounds});
        }
        if (limit.high && value.low >= *limit.high) {
            urgent.push_back({limit.quantity, value.low, quantity->unit, *limit.high, false, limit.grounds});
        }
    }
    return urgent;
}

}  // namespace steelyard::likelihoods
