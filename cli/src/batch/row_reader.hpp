// SPDX-License-Identifier: Apache-2.0
#pragma once
// The rows of a block of cases, read one after another: to what a pattern needs, or to whole panels.

#include <functional>
#include <optional>
#include <string_view>
#include <vector>

#include "case_columns.hpp"
#include "csv_fields.hpp"
#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::cli {

/// How cases stand in a file.
enum class CaseForm { csv, ndjson };

/// One row. Its views last until the next row is read.
struct Row {
    document::SourcePosition where;
    std::string_view case_id;
    std::string_view final_cause;                           ///< empty when there is none
    const std::vector<std::string_view>* fields = nullptr;  ///< of CSV
    std::optional<likelihoods::BatchReading> reading;       ///< empty: the row is set aside
    std::optional<likelihoods::Panel> panel;   ///< when whole panels are wanted, and it can be read
    std::vector<document::Diagnostic> faults;  ///< why it is set aside
    std::vector<std::string> values;           ///< for each fault the value, where it is about one
};

/// Of one thread.
class RowReader {
  public:
    /// @param whole_panels  whether panels are wanted beside readings
    RowReader(const likelihoods::TableSet& tables, bool whole_panels);

    const likelihoods::PointReader& points() const noexcept { return points_; }
    const likelihoods::FeatureVocabulary& vocabulary() const noexcept { return vocabulary_; }

    /// Calls `use` for each row of the block. Empty lines are no rows.
    /// @param columns  of a CSV file; not looked at for NDJSON
    void read(const Block& block, CaseForm form, const std::string& file, const CaseColumns& columns,
              const std::function<void(const Row&)>& use);

  private:
    void read_csv_row(std::string_view line, const CaseColumns& columns, bool well_formed);
    void read_json_row(std::string_view line);
    bool read_quickly(const CaseColumns& columns);
    void read_with_words(std::string_view line, const CaseColumns& columns);
    void keep(likelihoods::Panel panel);
    void set_aside(const document::SourcePosition& where, document::Code code, std::string message,
                   std::string hint, std::string_view line);

    const likelihoods::TableSet& tables_;
    likelihoods::FeatureVocabulary vocabulary_;
    likelihoods::PointReader points_;
    bool can_be_quick_;
    bool whole_panels_;
    likelihoods::PointPanel empty_, panel_;
    CsvFields csv_;
    std::vector<std::string_view> fields_;  ///< without outer blanks
    std::string final_cause_, case_id_;     ///< of NDJSON
    Row row_;
};

}  // namespace steelyard::cli
