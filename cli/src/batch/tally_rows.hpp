// SPDX-License-Identifier: Apache-2.0
#pragma once
// Files of many cases, counted into one tally.

#include <string>
#include <vector>

#include "batch_counts.hpp"
#include "case_inputs.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/tally.hpp"

namespace steelyard::cli {

struct RowsToTally {
    std::vector<std::string> by;  ///< columns whose values, joined by ` / `, are the strata
    std::string over;             ///< column of dates (YYYY-MM-DD or YYYY-MM); empty: no months are kept
    std::string rejects;          ///< file for the rows that cannot be read; empty for none
    bool strict = false;          ///< stop at the first of them
    int threads = 1;
};

/// @param files  of rows  @throws document::LoadError, OutputError
Tally tally_rows(std::vector<CaseFile> files, const likelihoods::TableSet& tables, const RowsToTally& wanted,
                 const Streams& streams);

/// The month of a date, `2025-03` of `2025-03-17` or `2025-03-17T08:30`; empty when it is no date.
std::string_view month_of(std::string_view date);

}  // namespace steelyard::cli
