// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whatever an audit is given, as one tally.

#include <optional>
#include <string>
#include <vector>

#include "steelyard/cli/tally.hpp"
#include "steelyard/document/diagnostic.hpp"

namespace steelyard::cli {

struct TallyWanted {
    std::vector<std::string> by;  ///< columns whose values are the strata; empty: as the tallies have it
    std::string over;             ///< column of dates, of which the month is kept; empty: none asked for
};

/// All inputs added up. Tallies must agree with each other, with the bands of the tables and with what is
/// wanted; tally_mismatch at the file that does not.
/// @returns  empty when there were faults
std::optional<Tally> tally_of_inputs(const std::vector<std::string>& paths,
                                     const likelihoods::TableSet& tables, const TallyWanted& wanted,
                                     document::Diagnostics& faults);

}  // namespace steelyard::cli
