// SPDX-License-Identifier: Apache-2.0
#pragma once
// Rows that could not be read: each named on standard error, and in a file where one is asked for.

#include <memory>
#include <string>
#include <vector>

#include "row_reader.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/output.hpp"

namespace steelyard::cli {

struct RejectedRow {
    std::string case_id;
    std::vector<document::Diagnostic> faults;
    std::vector<std::string> values;

    static RejectedRow of(const Row& row);
};

class Rejects {
  public:
    /// @param path    of the file; empty for none
    /// @param strict  the first row is an error: add() throws document::LoadError
    Rejects(const std::string& path, bool strict, const Streams& streams);
    void add(const std::vector<RejectedRow>& rows);
    void finish();

  private:
    std::unique_ptr<ResultWriter> file_;
    bool strict_;
    const Streams& streams_;
};

}  // namespace steelyard::cli
