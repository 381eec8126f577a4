// SPDX-License-Identifier: Apache-2.0
#pragma once
// A row of evidence as written, checked for shape but not yet compiled, and the steps that compile the rows
// of a table.

#include <optional>
#include <string>
#include <vector>

#include "read_table_file.hpp"

namespace steelyard::likelihoods::detail {

/// One row as written. Numbers are in canonical units.
struct GivenRow {
    EvidenceRow row;                       ///< everything but `compiled`
    std::vector<double> numbers;           ///< counts, shares, ratios, or the cells of a joint table
    std::vector<double> log_sd;            ///< ratios: standard deviation of ln ratio; 0 without a range
    double mean = 0.0, sd = 0.0, n = 0.0;  ///< summary
    double worth = 0.0;                    ///< share
    engine::Scale scale = engine::Scale::linear;
    document::SourcePosition numbers_at;  ///< where the form's own key has its value
    document::SourcePosition against_at;  ///< ratio
    bool whole = false;                   ///< nothing is wrong with it: it can be compiled
};

/// Reads one row. @param node  its mapping
GivenRow read_row(const document::Node& node, const std::string& cause, const TableFile& file,
                  const SetNames& names, document::Diagnostics& faults);

/// Compiles the whole rows among `given` into `table.rows` (in order of `given`), ratios after what they
/// refer to, and raises bands of judged rows to the table's `least` before normalising. @param study_mix
/// shares of the rows' causes, when the table has them
void compile_rows(std::vector<GivenRow>& given, const std::optional<std::vector<double>>& study_mix,
                  EvidenceTable& table, document::Diagnostics& faults);

}  // namespace steelyard::likelihoods::detail
