// SPDX-License-Identifier: Apache-2.0
#pragma once
// From which values simulated cases are made up. Judgement, for making up cases only: nothing is weighed by
// it.

#include <string_view>

namespace steelyard::likelihoods::detail {

/// Where values of a quantity lie in patients of the kind that the tables speak of, and with how many
/// decimals a laboratory writes them; in the canonical unit.
struct SensibleRange {
    double low = 0.0, high = 0.0;
    int decimals = 0;
};

/// @param quantity  an analyte or derived quantity; one that the list does not have gets its plausible range
SensibleRange sensible_range(std::string_view quantity);

}  // namespace steelyard::likelihoods::detail
