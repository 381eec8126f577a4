// SPDX-License-Identifier: Apache-2.0
#pragma once
// Final causes from a CSV file (RFC 4180) with the columns `case` and `final_cause`.

#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/diagnostic.hpp"

namespace steelyard::cli {

/// One line of the file, with where its two fields stand.
struct OutcomeLine {
    std::string case_id, final_cause;
    document::SourcePosition case_at, cause_at;
};

/// Lines in the order of the file; empty ones are passed over. Faults are collected, a faulty line is left
/// out. The text is remembered in `faults`.
std::vector<OutcomeLine> read_outcome_lines(std::string_view text, const std::string& file,
                                            document::Diagnostics& faults);

}  // namespace steelyard::cli
