// SPDX-License-Identifier: Apache-2.0
#pragma once
// The header of a CSV file of cases: which column holds what, in which unit.

#include <optional>
#include <string>
#include <vector>

#include "record_reader.hpp"
#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/point_reader.hpp"

namespace steelyard::cli {

enum class ColumnRole { ignored, case_id, sex, age, number, feature, method, final_cause };

struct Column {
    ColumnRole role = ColumnRole::ignored;
    std::string name;  ///< flat name, without the unit
    std::string unit;  ///< as written; empty when none
    /// Of a number whose unit the header gives: its quantity and scale. Otherwise -1: each cell has its unit.
    int quantity = -1;
    double factor = 1.0, low = 0.0, high = 0.0;
    int feature = -1;  ///< number of the feature in the reader
};

/// What a command wants of columns beside those of the case.
struct ColumnWishes {
    std::vector<std::string> carry;  ///< copied to the result as they are
    std::vector<std::string> by;     ///< strata
    std::string over;                ///< dates
};

struct CaseColumns {
    std::vector<Column> columns;  ///< one for each field of a row
    std::size_t case_id = 0;
    std::optional<std::size_t> final_cause;
    std::vector<std::size_t> carry, by;
    std::optional<std::size_t> over;
    std::vector<std::string> not_read;  ///< names of the columns that nothing reads
};

/// Reads the header. Faults of it are added; `columns` is then not to be used.
CaseColumns read_header(const Block& header, const std::string& file, const likelihoods::PointReader& reader,
                        const ColumnWishes& wishes, document::Diagnostics& faults);

/// `serum_potasium (did you mean serum_potassium?), ward`.
std::string columns_in_words(const std::vector<std::string>& names,
                             const likelihoods::FeatureVocabulary& vocabulary);

}  // namespace steelyard::cli
