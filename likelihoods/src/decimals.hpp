// SPDX-License-Identifier: Apache-2.0
#pragma once
// How many decimals a clinician expects of a quantity. A value is never rounded onto a limit that it does not
// meet.

#include <string>
#include <string_view>

namespace steelyard::likelihoods::detail {

/// Decimals always written, and decimals written at most.
struct Decimals {
    int least = 0;
    int most = 1;
};

/// Two for a pH or a plain ratio, none for a filtration rate, otherwise one where it is needed.
Decimals decimals_of(std::string_view quantity);

/// The decimals that a limit needs to be written exactly, at most four.
int decimals_needed(double limit);

/// `14`, `13.9`, `7.20`.
std::string decimal(double value, Decimals decimals);

/// The same with as many more decimals, up to three, as tell the value from a limit that it does not meet.
std::string decimal_beside(double value, double limit, Decimals decimals);

}  // namespace steelyard::likelihoods::detail
