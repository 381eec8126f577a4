// SPDX-License-Identifier: Apache-2.0
#include "known_quantity.hpp"

#include <algorithm>

#include "band_edges.hpp"
#include "steelyard/likelihoods/interval_words.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods::detail {

Answer is_below(const Interval& value, double limit) {
    const bool all = value.high_open ? !strictly_above(value.high, limit) : !at_or_above(value.high, limit);
    if (all) {
        return Answer::yes;
    }
    return at_or_above(value.low, limit) ? Answer::no : Answer::unknown;
}

Answer is_above(const Interval& value, double limit) {
    const bool all = value.low_open ? at_or_above(value.low, limit) : strictly_above(value.low, limit);
    if (all) {
        return Answer::yes;
    }
    return strictly_above(value.high, limit) ? Answer::unknown : Answer::no;
}

std::string Known::words() const {
    const Decimals decimals = decimals_of(id_);
    return interval_in_words(
        value_, [decimals](double value) { return decimal(value, decimals); }, unit_in_words());
}

std::string Known::words_beside(double limit) const {
    const Decimals decimals = decimals_of(id_);
    return interval_in_words(
        value_, [decimals, limit](double value) { return decimal_beside(value, limit, decimals); },
        unit_in_words());
}

std::string Known::limit_words(double limit) const {
    Decimals decimals = decimals_of(id_);
    decimals.most = std::max(decimals.most, decimals_needed(limit));
    return decimal(limit, decimals) + unit_in_words();
}

std::string Known::unit_in_words() const {
    const QuantityKind* kind = find_quantity(id_);
    return unit_after_number(kind != nullptr ? kind->unit : "");
}

}  // namespace steelyard::likelihoods::detail
