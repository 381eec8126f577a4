// SPDX-License-Identifier: Apache-2.0
#pragma once
// A condition of `usable_when` in words.

#include <string>

#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods::detail {

/// `when urine sodium is at least 25 mmol/L`, `when lithium is absent`, with what happens when it is not
/// known.
std::string condition_in_words(const TableSet& set, const Condition& condition);

}  // namespace steelyard::likelihoods::detail
