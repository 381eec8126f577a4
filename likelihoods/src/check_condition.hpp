// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether a table may be read for one panel, and in which words to say why not.

#include <string>
#include <vector>

#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods::detail {

/// What is known of a quantity, in words with its unit: `below 5.0 mmol/L` for a reading `<5.0`, as it was
/// written.
std::string known_as(const Panel& panel, std::string_view id, const QuantityValue& quantity);

struct Applicability {
    bool usable = true;
    bool fails = false;                  ///< a condition is known to fail; not so when it is only unknown
    std::string why_not;                 ///< when not usable
    std::vector<std::string> remarks;    ///< conditions that a censored value leaves open
    std::vector<std::string> unchecked;  ///< subjects of conditions of which nothing is known
};

/// Checks the conditions in order. One that fails outweighs one that cannot be checked.
Applicability check_conditions(const TableSet& set, const std::vector<Condition>& conditions,
                               const Panel& panel, const Quantities& quantities);

}  // namespace steelyard::likelihoods::detail
