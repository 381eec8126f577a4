// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whatever an audit is given, as one tally.

#include <optional>
#include <string>
#include <vector>

#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/tally.hpp"
#include "steelyard/document/diagnostic.hpp"

namespace steelyard::cli {

struct TallyWanted {
    std::vector<std::string> by;  ///< columns whose values are the strata; empty: as the tallies have it
    std::string over;             ///< column of dates, of which the month is kept; empty: none asked for
    std::string from = "auto";    ///< how cases are written
    std::string rejects;          ///< file for the rows that cannot be read; empty for none
    bool strict = false;          ///< stop at the first of them
    int threads = 1;
};

struct TallyOfInputs {
    Tally tally;
    std::uint64_t set_aside = 0;  ///< rows of cases that could not be read now
};

/// All inputs added up: tallies, and files of many cases, which are counted. Tallies must agree with each
/// other, with the bands of the tables and with what is wanted; tally_mismatch at the file that does not.
/// @returns  empty when there were faults
std::optional<TallyOfInputs> tally_of_inputs(const std::vector<std::string>& paths,
                                             const likelihoods::TableSet& tables, const TallyWanted& wanted,
                                             const Streams& streams, document::Diagnostics& faults);

}  // namespace steelyard::cli
